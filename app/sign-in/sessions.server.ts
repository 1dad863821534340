import { createHash, randomBytes } from 'node:crypto'
import { createCookie } from 'react-router'
import { environment } from '~/environment.server'
import type { Database } from '~database/connection.server'

const idleMs = 12 * 3_600_000
const absoluteMs = 14 * 86_400_000
/** A request within this time of the last one does not write again. */
const seenEveryMs = 60_000

/**
 * The session cookie: a random id, signed. Over https it is Secure and bound to this very host by its name.
 */
function sessionCookie() {
  const secure = environment().address.startsWith('https:')
  return createCookie(secure ? '__Host-lavant' : 'lavant', {
    httpOnly: true,
    sameSite: 'lax',
    path: '/',
    secure,
    maxAge: absoluteMs / 1000,
    secrets: [environment().sessionSecret],
  })
}

function hashOf(id: string): string {
  return createHash('sha256').update(id).digest('hex')
}

async function sessionIdOf(request: Request): Promise<string | undefined> {
  const value: unknown = await sessionCookie().parse(request.headers.get('cookie'))
  return typeof value === 'string' && value.length > 0 ? value : undefined
}

/** Who a session belongs to, and the SHA-256 by which the table knows it. */
export interface Session {
  idHash: string
  userId: number
  name: string
  email: string
  isAdministrator: boolean
}

/**
 * Starts a session with a new id, ends the one that this browser had, and notes a first sign-in.
 * Returns the Set-Cookie header.
 */
export async function startSession(db: Database, userId: number, request: Request): Promise<string> {
  const id = randomBytes(32).toString('base64url')
  const earlier = await sessionIdOf(request)
  const now = new Date()
  await db.transaction(async (trx) => {
    // First of all, so that two sign-ins of one person at once wait here; the session's foreign key locks this row too.
    await trx('users')
      .where({ id: userId })
      .whereNull('first_signed_in_at')
      .update({ first_signed_in_at: now })
    if (earlier) {
      await trx('sessions')
        .where({ id_hash: hashOf(earlier) })
        .whereNull('ended_at')
        .update({ ended_at: now })
    }
    await trx('sessions').insert({
      id_hash: hashOf(id),
      user_id: userId,
      created_at: now,
      last_seen_at: now,
      expires_at: new Date(now.getTime() + absoluteMs),
    })
  })
  await forgetOldSessions(db)
  return sessionCookie().serialize(id)
}

/** Removes a few sessions that ended long ago. Found without a lock first: a sign-in must not wait for others. */
async function forgetOldSessions(db: Database): Promise<void> {
  const longAgo = new Date(Date.now() - 30 * 86_400_000)
  const old = await db('sessions').where('expires_at', '<', longAgo).limit(100).pluck('id_hash')
  if (old.length > 0) await db('sessions').whereIn('id_hash', old).delete()
}

/** Sessions that are neither ended nor past their idle or absolute time, of people who have not left. */
function openSessions(db: Database) {
  const now = Date.now()
  return db('sessions')
    .join('users', 'users.id', 'sessions.user_id')
    .whereNull('sessions.ended_at')
    .whereNull('users.left_at')
    .where('sessions.expires_at', '>', new Date(now))
    .where('sessions.last_seen_at', '>', new Date(now - idleMs))
}

/** The open session of a request; undefined when signed out, expired or ended. */
export async function findSession(db: Database, request: Request): Promise<Session | undefined> {
  const id = await sessionIdOf(request)
  if (!id) return undefined
  const idHash = hashOf(id)
  const row = await openSessions(db)
    .where('sessions.id_hash', idHash)
    .first<
      | { user_id: number; last_seen_at: Date; name: string; email: string; is_administrator: number }
      | undefined
    >('sessions.user_id', 'sessions.last_seen_at', 'users.name', 'users.email', 'users.is_administrator')
  if (!row) return undefined
  const now = Date.now()
  if (now - row.last_seen_at.getTime() > seenEveryMs) {
    await db('sessions')
      .where({ id_hash: idHash })
      .whereNull('ended_at')
      .update({ last_seen_at: new Date(now) })
  }
  return {
    idHash,
    userId: row.user_id,
    name: row.name,
    email: row.email,
    isAdministrator: Boolean(row.is_administrator),
  }
}

export interface SessionLine {
  startedAt: Date
  lastSeenAt: Date
  isThisOne: boolean
}

/** A person's open sessions, newest first. */
export async function listSessions(db: Database, userId: number, thisIdHash: string): Promise<SessionLine[]> {
  const rows = await openSessions(db)
    .where('sessions.user_id', userId)
    .orderBy('sessions.created_at', 'desc')
    .select<{ id_hash: string; created_at: Date; last_seen_at: Date }[]>(
      'sessions.id_hash',
      'sessions.created_at',
      'sessions.last_seen_at',
    )
  return rows.map((row) => ({
    startedAt: row.created_at,
    lastSeenAt: row.last_seen_at,
    isThisOne: row.id_hash === thisIdHash,
  }))
}

/** Ends the session of this browser. Returns the Set-Cookie header that removes its cookie. */
export async function endSession(db: Database, request: Request): Promise<string> {
  const id = await sessionIdOf(request)
  if (id)
    await db('sessions')
      .where({ id_hash: hashOf(id) })
      .whereNull('ended_at')
      .update({ ended_at: new Date() })
  return sessionCookie().serialize('', { maxAge: 0 })
}

/**
 * Ends every session of a person; call it in the transaction of the change that takes a right away.
 */
export async function endSessionsOf(db: Database, userId: number): Promise<void> {
  await db('sessions').where({ user_id: userId }).whereNull('ended_at').update({ ended_at: new Date() })
}
