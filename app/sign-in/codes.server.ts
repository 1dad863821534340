import { createHmac, randomUUID, timingSafeEqual } from 'node:crypto'
import { createCookie } from 'react-router'
import { environment } from '~/environment.server'
import { sendMail } from '~/mail/mail.server'
import type { Database } from '~database/connection.server'
import { codePeriod, confirmCode, makeCode } from './code-strategy.server'
import { giveBack, spend } from './limits.server'

/** Wrong codes that one record bears. */
const triesPerRecord = 5

interface CodeRecord {
  id: string
  email: string
  purpose: string
  code_hash: string
  attempts: number
  created_at: Date
  expires_at: Date
  used_at: Date | null
}

interface Flow {
  id: string
  sealed: string
}

/** The browser's half of a code under way: the record's id and the sealed text, signed. */
function flowCookie() {
  const secure = environment().address.startsWith('https:')
  return createCookie(secure ? '__Host-lavant-code' : 'lavant-code', {
    httpOnly: true,
    sameSite: 'lax',
    path: '/',
    secure,
    maxAge: codePeriod,
    secrets: [environment().sessionSecret],
  })
}

async function flowOf(request: Request): Promise<Flow | undefined> {
  const value: unknown = await flowCookie().parse(request.headers.get('cookie'))
  if (typeof value !== 'object' || value === null) return undefined
  const { id, sealed } = value as Partial<Flow>
  return typeof id === 'string' && typeof sealed === 'string' ? { id, sealed } : undefined
}

/** Bound to everything that the code is for, so that a row moved to another e-mail or purpose fits no code. */
function hashOf(record: { id: string; email: string; purpose: string }, code: string): string {
  return createHmac('sha256', environment().codeSecret)
    .update(JSON.stringify([record.id, record.email, record.purpose, code]))
    .digest('hex')
}

/** Removes a few codes that ended long ago; found without a lock first, so that nobody waits. */
async function forgetOldCodes(db: Database): Promise<void> {
  const longAgo = new Date(Date.now() - 86_400_000)
  const old = await db('sign_in_codes').where('expires_at', '<', longAgo).limit(100).pluck('id')
  if (old.length > 0) await db('sign_in_codes').whereIn('id', old).delete()
}

/**
 * Makes a code for one purpose ('sign in', or the very thing that is to be signed) and, where `known` says so, mails
 * it. Whoever the address belongs to, the same is done and answered: the mail goes out after the answer, so that its
 * time does not tell either.
 * Returns the Set-Cookie header for the browser, or the seconds to wait when too many codes were asked for.
 */
export async function sendCode(
  db: Database,
  options: {
    email: string
    purpose: string
    clientAddress: string
    known: boolean
    mail: (code: string) => { subject: string; text: string }
  },
): Promise<{ cookie: string } | { waitSeconds: number }> {
  const { email, purpose, clientAddress, known, mail } = options
  const waitSeconds =
    (await spend('code for address', clientAddress)) ?? (await spend('code for e-mail', email))
  if (waitSeconds !== undefined) return { waitSeconds }

  const { code, sealed } = await makeCode(email)
  const id = randomUUID()
  const now = Date.now()
  await db<CodeRecord>('sign_in_codes').insert({
    id,
    email,
    purpose,
    code_hash: hashOf({ id, email, purpose }, code),
    attempts: 0,
    created_at: new Date(now),
    expires_at: new Date(now + codePeriod * 1000),
  })
  await forgetOldCodes(db)
  if (known) {
    sendMail({ to: email, ...mail(code) }).catch((error: unknown) => {
      console.error('A code could not be mailed:', error)
    })
  }
  return { cookie: await flowCookie().serialize({ id, sealed }) }
}

/** Whether this browser asked for a code lately, be it used or not. */
export async function hasAskedForCode(request: Request): Promise<boolean> {
  return (await flowOf(request)) !== undefined
}

/** The e-mail that the code under way in this browser was asked for; undefined when there is none. */
export async function emailUnderWay(
  db: Database,
  request: Request,
  purpose: string,
): Promise<string | undefined> {
  const flow = await flowOf(request)
  if (!flow) return undefined
  const record = await db<CodeRecord>('sign_in_codes')
    .where({ id: flow.id, purpose })
    .whereNull('used_at')
    .where('expires_at', '>', new Date())
    .first()
  return record?.email
}

export type CodeAnswer =
  | { ok: true; email: string; cookie: string }
  | { ok: false; reason: 'wrong' | 'ended' | 'too many'; waitSeconds?: number }

/**
 * Checks a code against the record that this browser's signed cookie names, and consumes it. Every try is counted
 * before it is looked at: per record, per e-mail and per client address. 'ended' covers a code that is used up,
 * too old, of another browser, for another purpose, or tried too often.
 */
export async function consumeCode(
  db: Database,
  options: { request: Request; purpose: string; code: string; clientAddress: string },
): Promise<CodeAnswer> {
  const { request, purpose, code, clientAddress } = options
  const ofAddress = await spend('try for address', clientAddress)
  if (ofAddress !== undefined) return { ok: false, reason: 'too many', waitSeconds: ofAddress }
  const flow = await flowOf(request)
  if (!flow) return { ok: false, reason: 'ended' }
  const open = () =>
    db<CodeRecord>('sign_in_codes')
      .where({ id: flow.id, purpose })
      .whereNull('used_at')
      .where('expires_at', '>', new Date())
  const counted = await open().where('attempts', '<', triesPerRecord).increment('attempts', 1)
  const record = counted === 1 ? await open().first() : undefined
  if (!record) return { ok: false, reason: 'ended' }
  const ofEmail = await spend('try for e-mail', record.email)
  if (ofEmail !== undefined) return { ok: false, reason: 'too many', waitSeconds: ofEmail }

  const given = Buffer.from(hashOf(record, code), 'hex')
  const right = timingSafeEqual(given, Buffer.from(record.code_hash, 'hex'))
  if (!right || !(await confirmCode(record.email, code, flow.sealed))) {
    return { ok: false, reason: record.attempts >= triesPerRecord ? 'ended' : 'wrong' }
  }
  // Two requests with the right code at once: one of them finds it used.
  const consumed = await open().update({ used_at: new Date() })
  if (consumed !== 1) return { ok: false, reason: 'ended' }
  await giveBack('try for address', clientAddress)
  await giveBack('try for e-mail', record.email)
  return { ok: true, email: record.email, cookie: await flowCookie().serialize('', { maxAge: 0 }) }
}
