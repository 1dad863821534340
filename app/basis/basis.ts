import { z } from 'zod'
import { source, text } from '~/book/field'

/** Section 1 as a form: one row of kind "basis" a project. */
export const basisSchema = z.strictObject({
  question: text(2000, 'State the question that the calculation answers.'),
  accuracy: text(500, 'State the accuracy that the answer needs.'),
  intendedUse: text(1000).default(''),
  notFor: text(1000).default(''),
  idealisation: text(2000).default(''),
  conclusions: text(4000).default(''),
})
export type Basis = z.infer<typeof basisSchema>

export const assumptionSchema = z.strictObject({
  reference: text(12, 'Give the assumption a reference such as A1.'),
  statement: text(1000, 'State what is assumed.'),
  why: text(1000).default(''),
  effect: text(1000).default(''),
  source,
})
export type Assumption = z.infer<typeof assumptionSchema>

export const standardStatuses = ['current', 'withdrawn', 'not known'] as const
export const standardSchema = z.strictObject({
  title: text(300, 'Name the standard or guide.'),
  edition: text(80).default(''),
  status: z.enum(standardStatuses).default('not known'),
  use: text(500).default(''),
})
export type Standard = z.infer<typeof standardSchema>
