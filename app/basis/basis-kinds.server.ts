import type { RowKind } from '~/book/rows.server'
import { type Assumption, assumptionSchema, basisSchema, type Standard, standardSchema } from './basis'

/** The kinds of row of section 1. */
export const basisKinds: Record<string, RowKind> = {
  basis: { section: 'basis', schema: basisSchema, label: () => 'basis' },
  assumption: {
    section: 'basis',
    schema: assumptionSchema,
    label: (body: never) => (body as Assumption).reference,
  },
  standard: { section: 'basis', schema: standardSchema, label: (body: never) => (body as Standard).title },
}
