import { readdir, readFile } from 'node:fs/promises'
import { join } from 'node:path'
import { z } from 'zod'

const mailSchema = z.object({
  id: z.string(),
  at: z.iso.datetime(),
  from: z.string(),
  to: z.array(z.string()),
  subject: z.string(),
  text: z.string(),
})
export type ReceivedMail = z.infer<typeof mailSchema>

/**
 * The newest mails that the demo's mail server keeps in a folder, newest first. An empty list when there is no
 * folder yet. Throws when a file is not a mail.
 */
export async function readMailbox(folder: string, limit = 100): Promise<ReceivedMail[]> {
  // The names begin with the time of arrival.
  const names = (await readdir(folder).catch(emptyWhenMissing))
    .filter((name) => name.endsWith('.json'))
    .sort()
  const newest = names.reverse().slice(0, limit)
  return Promise.all(
    newest.map(async (name) => mailSchema.parse(JSON.parse(await readFile(join(folder, name), 'utf8')))),
  )
}

function emptyWhenMissing(error: NodeJS.ErrnoException): string[] {
  if (error.code === 'ENOENT') return []
  throw error
}
