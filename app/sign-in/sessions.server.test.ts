import { createHash } from 'node:crypto'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson, signIn } from '../../test/people'
import { endSession, endSessionsOf, findSession, listSessions, startSession } from './sessions.server'

let db: FreshDatabase
let ada: number
beforeAll(async () => {
  db = await freshDatabase()
  ada = await makePerson(db.database, { name: 'Ada' })
})
afterAll(() => db.close())

const bearing = (cookie: string) => new Request('http://lavant.test/', { headers: { cookie } })
const hashOf = (cookie: string) => {
  const signed = decodeURIComponent(cookie.slice(cookie.indexOf('=') + 1))
  const id = JSON.parse(Buffer.from(signed.slice(0, signed.lastIndexOf('.')), 'base64').toString()) as string
  return { id, idHash: createHash('sha256').update(id).digest('hex') }
}

test('A session is a random id in a signed cookie that scripts and other sites cannot use; only its hash is stored', async () => {
  const header = await startSession(db.database, ada, bearing(''))
  expect(header).toMatch(/^lavant=/)
  expect(header).toMatch(/; HttpOnly/)
  expect(header).toMatch(/; SameSite=Lax/)
  expect(header).toMatch(/; Path=\//)
  const { id, idHash } = hashOf(header.split(';')[0] ?? '')
  expect(Buffer.from(id, 'base64url')).toHaveLength(32)
  expect(await db.database('sessions').where({ id_hash: idHash })).toHaveLength(1)
  expect(JSON.stringify(await db.database('sessions'))).not.toContain(id)
  expect(await findSession(db.database, bearing(header))).toMatchObject({ userId: ada, name: 'Ada' })
})

test('An id without its signature opens nothing', async () => {
  const cookie = await signIn(db.database, ada)
  const { id } = hashOf(cookie)
  const unsigned = Buffer.from(JSON.stringify(id)).toString('base64')
  for (const forged of [
    `lavant=${id}`,
    `lavant=${unsigned}`,
    `lavant=${encodeURIComponent(`${unsigned}.AAAA`)}`,
  ]) {
    expect(await findSession(db.database, bearing(forged))).toBeUndefined()
  }
})

test('Signing in gives a new id and ends the session that this browser had', async () => {
  const before = await signIn(db.database, ada)
  const after = (await startSession(db.database, ada, bearing(before))).split(';')[0] ?? ''
  expect(after).not.toBe(before)
  expect(await findSession(db.database, bearing(before))).toBeUndefined()
  expect(await findSession(db.database, bearing(after))).toBeDefined()
})

test('A session ends after twelve idle hours, and use keeps it open', async () => {
  const cookie = await signIn(db.database, ada)
  const { idHash } = hashOf(cookie)
  const seen = (ago: number) =>
    db
      .database('sessions')
      .where({ id_hash: idHash })
      .update({ last_seen_at: new Date(Date.now() - ago) })
  await seen(11.9 * 3_600_000)
  expect(await findSession(db.database, bearing(cookie))).toBeDefined()
  const [row] = await db.database('sessions').where({ id_hash: idHash })
  expect(Date.now() - row.last_seen_at.getTime()).toBeLessThan(60_000)
  await seen(12.1 * 3_600_000)
  expect(await findSession(db.database, bearing(cookie))).toBeUndefined()
})

test('A session ends fourteen days after it began, however much it is used', async () => {
  const cookie = await signIn(db.database, ada)
  const { idHash } = hashOf(cookie)
  const [row] = await db.database('sessions').where({ id_hash: idHash })
  expect(row.expires_at.getTime() - row.created_at.getTime()).toBe(14 * 86_400_000)
  await db
    .database('sessions')
    .where({ id_hash: idHash })
    .update({ expires_at: new Date(Date.now() - 1) })
  expect(await findSession(db.database, bearing(cookie))).toBeUndefined()
})

test('Signing out ends this session and removes the cookie; signing out everywhere ends them all', async () => {
  const bea = await makePerson(db.database, { name: 'Bea' })
  const [desk, phone] = [await signIn(db.database, bea), await signIn(db.database, bea)]
  const lines = await listSessions(db.database, bea, hashOf(phone).idHash)
  expect(lines.map((line) => line.isThisOne).sort()).toEqual([false, true])
  expect(await endSession(db.database, bearing(desk))).toMatch(/^lavant=.*Max-Age=0/)
  expect(await findSession(db.database, bearing(desk))).toBeUndefined()
  expect(await findSession(db.database, bearing(phone))).toBeDefined()
  await endSessionsOf(db.database, bea)
  expect(await findSession(db.database, bearing(phone))).toBeUndefined()
})

test('Somebody who has left has no session', async () => {
  const cas = await makePerson(db.database, { name: 'Cas' })
  const cookie = await signIn(db.database, cas)
  await db.database('users').where({ id: cas }).update({ left_at: new Date() })
  expect(await findSession(db.database, bearing(cookie))).toBeUndefined()
})

test('The first sign-in is noted, later ones do not move it', async () => {
  const dan = await makePerson(db.database, { name: 'Dan' })
  await signIn(db.database, dan)
  const [first] = await db.database('users').where({ id: dan }).select('first_signed_in_at')
  expect(first.first_signed_in_at).toBeInstanceOf(Date)
  await signIn(db.database, dan)
  const [second] = await db.database('users').where({ id: dan }).select('first_signed_in_at')
  expect(second.first_signed_in_at).toEqual(first.first_signed_in_at)
})

test('Twenty sign-ins of one person at the same moment all succeed, with old sessions to clear away', async () => {
  const eve = await makePerson(db.database, { name: 'Eve' })
  await signIn(db.database, eve)
  await db
    .database('sessions')
    .where({ user_id: eve })
    .update({ expires_at: new Date(0) })
  const cookies = await Promise.all(Array.from({ length: 20 }, () => signIn(db.database, eve)))
  expect(new Set(cookies).size).toBe(20)
  for (const cookie of cookies) expect(await findSession(db.database, bearing(cookie))).toBeDefined()
  expect(await db.database('sessions').where({ user_id: eve, expires_at: new Date(0) })).toEqual([])
})
