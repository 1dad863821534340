import { createHmac } from 'node:crypto'
import { afterAll, beforeAll, beforeEach, expect, test, vi } from 'vitest'
import { environment } from '~/environment.server'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { consumeCode, emailUnderWay, sendCode } from './codes.server'

const posted = vi.hoisted(() => [] as { to: string; subject: string; text: string }[])
vi.mock('~/mail/mail.server', () => ({
  sendMail: async (mail: { to: string; subject: string; text: string }) => {
    posted.push(mail)
  },
}))

let db: FreshDatabase
beforeAll(async () => {
  db = await freshDatabase()
})
afterAll(() => db.close())
beforeEach(async () => {
  posted.length = 0
  await db.database('rate_limits').delete()
  await db.database('sign_in_codes').delete()
})

const mail = (code: string) => ({ subject: 'Code', text: code })

async function ask(
  email: string,
  options: { purpose?: string; known?: boolean; clientAddress?: string } = {},
) {
  const answer = await sendCode(db.database, {
    email,
    purpose: options.purpose ?? 'sign in',
    clientAddress: options.clientAddress ?? '192.0.2.1',
    known: options.known ?? true,
    mail,
  })
  if ('waitSeconds' in answer) throw new Error(`Refused for ${answer.waitSeconds} s`)
  return { cookie: answer.cookie.split(';')[0] ?? '', header: answer.cookie, code: posted.at(-1)?.text ?? '' }
}

function attempt(cookie: string, code: string, options: { purpose?: string; clientAddress?: string } = {}) {
  return consumeCode(db.database, {
    request: new Request('http://lavant.test/sign-in/code', { headers: { cookie } }),
    purpose: options.purpose ?? 'sign in',
    code,
    clientAddress: options.clientAddress ?? '192.0.2.1',
  })
}

/** A code of six figures that is not this one. */
function wrong(code: string, step = 1): string {
  return String((Number(code) + step) % 1_000_000).padStart(6, '0')
}

test('A code of six figures signs in the e-mail it was sent to', async () => {
  const { cookie, code, header } = await ask('ada@firm.test')
  expect(code).toMatch(/^\d{6}$/)
  expect(header).toMatch(/HttpOnly/)
  expect(header).toMatch(/SameSite=Lax/)
  const request = new Request('http://lavant.test/', { headers: { cookie } })
  expect(await emailUnderWay(db.database, request, 'sign in')).toBe('ada@firm.test')
  expect(await attempt(cookie, code)).toMatchObject({ ok: true, email: 'ada@firm.test' })
  expect(await emailUnderWay(db.database, request, 'sign in')).toBeUndefined()
})

test('Attack: a code asked for oneself with the e-mail in the cookie exchanged signs in nobody', async () => {
  const own = await ask('mallory@elsewhere.test')
  const victim = await ask('ada@firm.test')
  // The flow cookie, decoded: { id, sealed: '_totp=email=…&totp=…' } and a signature.
  const [name, value] = [
    own.cookie.slice(0, own.cookie.indexOf('=')),
    own.cookie.slice(own.cookie.indexOf('=') + 1),
  ]
  const [payload, signature] = decodeURIComponent(value).split(/\.(?=[^.]*$)/) as [string, string]
  const flow = JSON.parse(Buffer.from(payload, 'base64').toString()) as { id: string; sealed: string }
  expect(flow.sealed).toContain('mallory')
  const swapped = flow.sealed.replace(/mallory(@|%40|%2540)elsewhere/, 'ada$1firm')
  expect(swapped).not.toBe(flow.sealed)
  const forgedPayload = Buffer.from(JSON.stringify({ ...flow, sealed: swapped })).toString('base64')
  const forged = `${name}=${encodeURIComponent(`${forgedPayload}.${signature}`)}`
  expect(await attempt(forged, own.code)).toEqual({ ok: false, reason: 'ended' })
  // Nor does the bare cookie of the package, whatever it says.
  expect(await attempt(swapped, own.code)).toEqual({ ok: false, reason: 'ended' })
  // Even someone who could sign cookies gets no further: the record knows its e-mail.
  const resigned = createHmac('sha256', environment().sessionSecret)
    .update(forgedPayload)
    .digest('base64')
    .replace(/=+$/, '')
  const answer = await attempt(`${name}=${encodeURIComponent(`${forgedPayload}.${resigned}`)}`, own.code)
  expect(answer).toEqual({ ok: false, reason: 'wrong' })
  // The victim's own code is untouched by all that.
  expect(await attempt(victim.cookie, victim.code)).toMatchObject({ ok: true, email: 'ada@firm.test' })
})

test('Attack: wrong codes are counted; after five even the right one is refused', async () => {
  const { cookie, code } = await ask('ada@firm.test')
  for (let step = 1; step <= 4; step++) {
    expect(await attempt(cookie, wrong(code, step))).toEqual({ ok: false, reason: 'wrong' })
  }
  expect(await attempt(cookie, wrong(code, 5))).toEqual({ ok: false, reason: 'ended' })
  expect(await attempt(cookie, code)).toEqual({ ok: false, reason: 'ended' })
})

test('Attack: fifty wrong codes at once are no more than five tries', async () => {
  const { cookie, code } = await ask('ada@firm.test')
  const answers = await Promise.all(
    Array.from({ length: 50 }, (_, index) => attempt(cookie, wrong(code, index + 1))),
  )
  expect(answers.every((answer) => !answer.ok)).toBe(true)
  const [record] = await db.database('sign_in_codes').select('attempts')
  expect(record.attempts).toBe(5)
  expect(await attempt(cookie, code)).toEqual({ ok: false, reason: 'ended' })
})

test('Attack: new codes do not buy new tries without end; the e-mail has a limit of its own', async () => {
  let last = { cookie: '', code: '' }
  for (let record = 0; record < 5; record++) {
    last = await ask('ada@firm.test', { clientAddress: `198.51.100.${record}` })
    for (let step = 1; step <= 4; step++) {
      await attempt(last.cookie, wrong(last.code, step), { clientAddress: `198.51.100.${record}` })
    }
  }
  const answer = await attempt(last.cookie, last.code, { clientAddress: '198.51.100.77' })
  expect(answer).toMatchObject({ ok: false, reason: 'too many' })
})

test('One client address cannot try codes of many e-mails without end', async () => {
  for (let index = 0; index < 100; index++) await attempt('', '000000')
  const { cookie, code } = await ask('ada@firm.test')
  expect(await attempt(cookie, code)).toMatchObject({ ok: false, reason: 'too many' })
})

test('Attack: a code is used once, even when it is sent twice at the same moment', async () => {
  const { cookie, code } = await ask('ada@firm.test')
  const answers = await Promise.all([attempt(cookie, code), attempt(cookie, code), attempt(cookie, code)])
  expect(answers.filter((answer) => answer.ok)).toHaveLength(1)
  expect(await attempt(cookie, code)).toEqual({ ok: false, reason: 'ended' })
})

test('A code to sign in does not sign a package, nor the code for one package another', async () => {
  const signIn = await ask('ada@firm.test')
  expect(await attempt(signIn.cookie, signIn.code, { purpose: 'sign package 4 P01 abc' })).toEqual({
    ok: false,
    reason: 'ended',
  })
  const signing = await ask('ada@firm.test', { purpose: 'sign package 4 P01 abc' })
  expect(await attempt(signing.cookie, signing.code)).toEqual({ ok: false, reason: 'ended' })
  expect(await attempt(signing.cookie, signing.code, { purpose: 'sign package 4 P02 abc' })).toEqual({
    ok: false,
    reason: 'ended',
  })
  expect(await attempt(signing.cookie, signing.code, { purpose: 'sign package 4 P01 abc' })).toMatchObject({
    ok: true,
  })
})

test('A record whose purpose or e-mail is altered in the database fits no code', async () => {
  const { cookie, code } = await ask('mallory@elsewhere.test')
  await db.database('sign_in_codes').update({ email: 'ada@firm.test' })
  expect(await attempt(cookie, code)).toEqual({ ok: false, reason: 'wrong' })
})

test('A code ends ten minutes after it was asked for', async () => {
  const { cookie, code } = await ask('ada@firm.test')
  const [record] = await db.database('sign_in_codes').select('created_at', 'expires_at')
  expect(record.expires_at.getTime() - record.created_at.getTime()).toBe(600_000)
  await db.database('sign_in_codes').update({ expires_at: new Date(Date.now() - 1) })
  expect(await attempt(cookie, code)).toEqual({ ok: false, reason: 'ended' })
})

test('A code is bound to the browser that asked for it', async () => {
  const mine = await ask('ada@firm.test')
  const other = await ask('ada@firm.test')
  expect(await attempt(mine.cookie, other.code)).toEqual({ ok: false, reason: 'wrong' })
  expect(await attempt('', mine.code)).toEqual({ ok: false, reason: 'ended' })
})

test('Only the keyed hash of a code is stored', async () => {
  const { code } = await ask('ada@firm.test')
  const [record] = await db.database('sign_in_codes')
  expect(record.code_hash).toMatch(/^[0-9a-f]{64}$/)
  expect(JSON.stringify(record)).not.toContain(`"${code}"`)
})

test('An unknown address is answered alike, keeps the same records, and gets no mail', async () => {
  const known = await ask('ada@firm.test')
  const unknown = await ask('nobody@elsewhere.test', { known: false })
  const shape = (header: string) =>
    header.replace(/=[^;]*/, '=value').replace(/Expires=[^;]*/, 'Expires=date')
  expect(shape(unknown.header)).toBe(shape(known.header))
  expect(posted.map((sent) => sent.to)).toEqual(['ada@firm.test'])
  expect(await attempt(unknown.cookie, '000000')).toEqual({ ok: false, reason: 'wrong' })
})

test('An e-mail gets ten codes in a quarter of an hour, and is told how long to wait', async () => {
  for (let index = 0; index < 10; index++) await ask('ada@firm.test', { clientAddress: `203.0.113.${index}` })
  const refused = await sendCode(db.database, {
    email: 'ada@firm.test',
    purpose: 'sign in',
    clientAddress: '203.0.113.99',
    known: true,
    mail,
  })
  expect(refused).toMatchObject({ waitSeconds: expect.any(Number) })
  expect(posted).toHaveLength(10)
})
