import type { RowKind } from '~/book/rows.server'
import { type Case, caseSchema } from './case'

/** The kinds of row of section 4. A case that sets a quantity of a row can do without it once the row is deleted. */
export const casesKinds: Record<string, RowKind> = {
  case: {
    section: 'cases',
    schema: caseSchema,
    label: (body: never) => (body as Case).name,
    refersTo: (body: never) =>
      (body as Case).overrides.map(({ rowId }) => ({ field: 'overrides', id: rowId })),
    without: (body: never, id: string) => {
      const before = body as Case
      return { ...before, overrides: before.overrides.filter((override) => override.rowId !== id) }
    },
  },
}
