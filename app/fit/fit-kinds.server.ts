import type { RowKind } from '~/book/rows.server'
import { type Comparison, comparisonSchema } from './comparison'

/** The kind of row of section 7: the comparison that the book keeps. */
export const fitKinds: Record<string, RowKind> = {
  comparison: {
    section: 'fit',
    schema: comparisonSchema,
    label: (body: never) => `run ${(body as Comparison).runNumber}`,
  },
}
