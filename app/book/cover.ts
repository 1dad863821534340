import { z } from 'zod'
import { text } from './field'

/** Section 0 as a form: one row of kind "cover" a project. Names and dates come from the project and its packages. */
export const coverSchema = z.strictObject({
  purposeOfIssue: text(300).default(''),
  distribution: text(2000).default(''),
  remarks: text(2000).default(''),
})
export type Cover = z.infer<typeof coverSchema>

/** Forms are single rows: their id is their kind, so that two people who start one meet in the same row. */
export const coverRowId = 'cover'
