import { z } from 'zod'
import { coordinate, positive, quantity, text } from '~/book/field'

/** Quantities of other sections' rows that a case may set for itself. */
export const overridable = ['rate', 'k', 'recharge', 'level'] as const

/**
 * A calculation case. The base case holds all settings; another case holds only what differs: blank inherits.
 * An override names a row, a quantity of that row and its value in this case.
 */
export const caseSchema = z
  .strictObject({
    name: text(80, 'Name the case.'),
    isBase: z.boolean().default(false),
    note: text(1000).default(''),
    flow: z.enum(['confined', 'unconfined']).nullable().default(null),
    extent: z
      .strictObject({ xMin: coordinate, xMax: coordinate, yMin: coordinate, yMax: coordinate })
      .refine((e) => e.xMax > e.xMin && e.yMax > e.yMin, 'The extent must have a width and a height.')
      .nullable()
      .default(null),
    cellSize: positive('length', 'The cell size').nullable().default(null),
    tolerance: z
      .number()
      .gt(0)
      .max(1e-4, 'A tolerance above 1e-4 is too loose for heads.')
      .nullable()
      .default(null),
    overrides: z
      .array(
        z.strictObject({ rowId: z.string().min(1), quantity: z.enum(overridable), value: quantityOfAny() }),
      )
      .default([]),
  })
  .superRefine((c, context) => {
    if (!c.isBase) return
    for (const field of ['flow', 'extent', 'cellSize'] as const) {
      if (c[field] === null)
        context.addIssue({ code: 'custom', path: [field], message: 'The base case needs this.' })
    }
  })
export type Case = z.infer<typeof caseSchema>

function quantityOfAny() {
  return z.union([quantity('rate'), quantity('conductivity'), quantity('length'), quantity('line flux')])
}
