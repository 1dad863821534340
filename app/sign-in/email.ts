import { z } from 'zod'

/** An e-mail address as the table of users keeps it: in lower case. */
export const emailSchema = z
  .string({ error: 'Give the e-mail address.' })
  .trim()
  .toLowerCase()
  .max(254, 'An e-mail address has at most 254 characters.')
  .pipe(z.email('This is not an e-mail address.'))
