import { randomUUID } from 'node:crypto'
import { mkdir, rename, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { buffer } from 'node:stream/consumers'
import { SMTPServer } from 'smtp-server'
import { environment } from '../app/environment.server.ts'
import { readMessage } from './services/read-message.ts'
import { runUnderParent } from './services/under-parent.ts'

/**
 * The demo's mail server: takes every mail on loopback and sends none. Each becomes one JSON file in the mailbox
 * folder: {id, at, from, to, subject, text}, `at` in ISO 8601, `to` the addresses of the envelope.
 */
const { smtp, mailbox } = environment()
if (!mailbox) throw new Error('LAVANT_MAILBOX is missing: the folder that keeps received mail.')
const folder = mailbox
await mkdir(folder, { recursive: true, mode: 0o700 })

const server = new SMTPServer({
  authOptional: true,
  disabledCommands: ['STARTTLS'],
  disableReverseLookup: true,
  size: 10 * 1024 * 1024,
  async onData(stream, session, callback) {
    try {
      const message = readMessage(await buffer(stream))
      const at = new Date().toISOString()
      // The name sorts by time of arrival.
      const id = `${at.replaceAll(/\D/g, '')}-${randomUUID().slice(0, 8)}`
      const sender = session.envelope.mailFrom
      const mail = {
        id,
        at,
        from: message.from || (sender ? sender.address : ''),
        to: session.envelope.rcptTo.map((recipient) => recipient.address),
        subject: message.subject,
        text: message.text,
      }
      // Written aside and renamed, so that a reader never sees half a mail.
      const draft = join(folder, `${id}.part`)
      await writeFile(draft, `${JSON.stringify(mail, null, 2)}\n`, { mode: 0o600 })
      await rename(draft, join(folder, `${id}.json`))
      callback()
    } catch (error) {
      console.error(error)
      callback(error instanceof Error ? error : new Error(String(error)))
    }
  },
})
server.on('error', (error) => console.error(error))
server.listen(smtp.port, smtp.host, () =>
  runUnderParent(() => new Promise<void>((done) => server.close(done))),
)
