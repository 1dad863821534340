import type { RowKind } from '~/book/rows.server'
import { type Case, caseSchema } from './case'

/** The kinds of row of section 4. */
export const casesKinds: Record<string, RowKind> = {
  case: { section: 'cases', schema: caseSchema, label: (body: never) => (body as Case).name },
}
