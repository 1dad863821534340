import { randomUUID } from 'node:crypto'
import { existsSync, readdirSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { createTransport } from 'nodemailer'
import { afterAll, expect, test, vi } from 'vitest'
import { testServices } from './services.ts'

const { smtp, mailbox } = testServices()
const transport = createTransport({ host: smtp.host, port: smtp.port, ignoreTLS: true })
afterAll(() => transport.close())

interface Mail {
  id: string
  at: string
  from: string
  to: string[]
  subject: string
  text: string
}

/** The mail that reached an address nobody else uses. */
async function received(to: string): Promise<Mail> {
  const folder = mailbox ?? ''
  return vi.waitFor(() => {
    const mails = readdirSync(folder)
      .filter((name) => name.endsWith('.json'))
      .map((name) => JSON.parse(readFileSync(join(folder, name), 'utf8')) as Mail)
    const found = mails.find((mail) => mail.to.includes(to))
    if (!found) throw new Error(`No mail for ${to} yet.`)
    return found
  })
}

test.each([
  ['a short code', 'Your code: 123456', 'Your code is 123456.\n\nIt lasts ten minutes.'],
  [
    'letters and signs beyond ASCII',
    'Grundwasserstände Ω ≤ 4 m – Übersicht für die Prüfung der Baugrube und der Absenkung',
    'Größe: Ω ≤ 4 m²\n=3D stays, and so does a line that is so long that the format has to fold it somewhere before its end, after 76 characters.\n.\n.dot',
  ],
  ['a text that is mostly not Latin', 'Ω', 'Ωμέγα '.repeat(40).trim()],
])('The stand-in keeps %s exactly as it was sent', async (_, subject, text) => {
  const to = `${randomUUID()}@somebody.example`
  await transport.sendMail({ from: 'Lavant Büro <office@lavant.example>', to, subject, text })
  const mail = await received(to)
  expect(mail).toMatchObject({ subject, text, to: [to] })
  expect(mail.from).toContain('Lavant Büro')
  expect(Date.parse(mail.at)).toBeGreaterThan(Date.now() - 60_000)
  expect(existsSync(join(mailbox ?? '', `${mail.id}.json`))).toBe(true)
})

test('Of a mail with a formatted part and an attachment it keeps the plain text', async () => {
  const to = `${randomUUID()}@somebody.example`
  await transport.sendMail({
    from: 'office@lavant.example',
    to,
    subject: 'Two parts',
    text: 'Plain ≥ text',
    html: '<b>Formatted</b>',
    attachments: [{ filename: 'a.txt', content: 'attached' }],
  })
  expect((await received(to)).text).toBe('Plain ≥ text')
})
