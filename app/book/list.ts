import { z } from 'zod'

/** Wrong entries of one list that are named; reading it ends there. */
export const mostNamed = 20

/**
 * A list of so many entries. Zod's own reads every entry of a list that is too long, and names every wrong one: a
 * million zeros where a line should be would hold up the server for a minute.
 */
export function list<Entry extends z.ZodType>(
  entry: Entry,
  size: { least?: number; most?: number; tooFew?: string } = {},
) {
  return z
    .array(z.unknown())
    .min(size.least ?? 0, size.tooFew)
    .max(size.most ?? Number.MAX_SAFE_INTEGER)
    .transform((entries, context) => {
      const read: z.output<Entry>[] = []
      let wrong = 0
      for (const [index, one] of entries.entries()) {
        const answer = entry.safeParse(one)
        if (answer.success) {
          read.push(answer.data)
          continue
        }
        for (const issue of answer.error.issues)
          context.issues.push({ ...issue, path: [index, ...issue.path], input: one } as z.core.$ZodRawIssue)
        if (++wrong === mostNamed) break
      }
      return wrong === 0 ? read : z.NEVER
    })
}
