import { z } from 'zod'

const finite = z.number().refine(Number.isFinite)

/** The comparison that stands for section 7: which run, which readings, and what came of it. */
export const comparisonSchema = z.strictObject({
  runId: z.number().int().positive(),
  runNumber: z.number().int().positive(),
  span: z.union([
    z.strictObject({ date: z.iso.date() }),
    z.strictObject({ from: z.iso.date(), to: z.iso.date() }),
  ]),
  /** In the project's length unit; null when nothing could be compared. */
  statistics: z
    .strictObject({
      n: z.number().int().nonnegative(),
      bias: finite,
      mae: finite,
      rmse: finite,
      scaledRmse: finite.nullable(),
      largest: finite,
    })
    .nullable(),
})
export type Comparison = z.infer<typeof comparisonSchema>

/** There is one comparison a book: its id is its kind. */
export const comparisonRowId = 'comparison'
