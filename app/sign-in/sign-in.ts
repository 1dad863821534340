import { z } from 'zod'
import { emailSchema } from './email'

export const signInSchema = z.object({ email: emailSchema })

export const codeSchema = z.object({
  code: z
    .string({ error: 'Enter the code from the mail.' })
    .transform((text) => text.replaceAll(/\s/g, ''))
    .pipe(z.string().regex(/^\d{6}$/, 'The code has six figures.')),
})

/** How long to wait, in words. */
export function waitInWords(seconds: number): string {
  const minutes = Math.ceil(seconds / 60)
  return minutes === 1 ? 'a minute' : `${minutes} minutes`
}
