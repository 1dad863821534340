import type { RowKind } from '~/book/rows.server'
import { type Estimate, estimateSchema } from './estimate'

/** The kind of row of section 8. */
export const checkKinds: Record<string, RowKind> = {
  estimate: { section: 'checks', schema: estimateSchema, label: (body: never) => (body as Estimate).result },
}
