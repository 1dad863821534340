import { z } from 'zod'
import { text } from '~/book/field'

/** An independent estimate of one result, made by hand or by formula, to hold beside the run's own figure. */
export const estimateSchema = z.strictObject({
  result: text(200, 'Say which result this estimates.'),
  method: text(300, 'Name the formula or method.'),
  working: text(2000).default(''),
  value: z.number({ error: 'A number is needed.' }),
  unit: text(20, 'Give the unit.'),
  computed: z.number().nullable().default(null),
  source: text(500).default(''),
})
export type Estimate = z.infer<typeof estimateSchema>
