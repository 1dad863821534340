import { endSessionsOf } from '~/sign-in/sessions.server'
import type { Database } from '~database/connection.server'
import { recordHistory } from './history.server'
import type { Role } from './permissions'
import type { PersonInput } from './person'

export interface Person {
  id: number
  name: string
  email: string
  isAdministrator: boolean
  firstSignedInAt: Date | null
  leftAt: Date | null
}

interface UserRow {
  id: number
  name: string
  email: string
  is_administrator: number
  first_signed_in_at: Date | null
  left_at: Date | null
}

function fromRow(row: UserRow): Person {
  return {
    id: row.id,
    name: row.name,
    email: row.email,
    isAdministrator: Boolean(row.is_administrator),
    firstSignedInAt: row.first_signed_in_at,
    leftAt: row.left_at,
  }
}

/** Everybody whom the firm knows, those who left at the end. */
export async function listPeople(db: Database): Promise<Person[]> {
  const rows = await db<UserRow>('users').orderByRaw('left_at is not null').orderBy('name')
  return rows.map(fromRow)
}

/** Everybody who may sign in, with the roles they hold somewhere: for the demo, where one chooses whom to be. */
export async function peopleWithRoles(db: Database): Promise<(Person & { roles: Role[] })[]> {
  const people = (await listPeople(db)).filter((person) => !person.leftAt)
  const held = await db('members')
    .whereNull('to_at')
    .distinct('user_id', 'role')
    .orderBy('role')
    .select<{ user_id: number; role: Role }[]>()
  return people.map((person) => ({
    ...person,
    roles: held.filter((row) => row.user_id === person.id).map((row) => row.role),
  }))
}

/** The person behind an e-mail address in lower case. */
export async function findPersonByEmail(db: Database, email: string): Promise<Person | undefined> {
  const row = await db<UserRow>('users').where({ email }).first()
  return row && fromRow(row)
}

/** Adds a person of the firm or of a client. Returns the id; 'taken' when the address is known already. */
export async function addPerson(
  db: Database,
  person: PersonInput & { isAdministrator?: boolean },
  byUserId?: number,
): Promise<{ id: number } | 'taken'> {
  return db.transaction(async (trx) => {
    const [id] = await trx('users')
      .insert({
        email: person.email,
        name: person.name,
        is_administrator: person.isAdministrator ?? false,
        created_at: new Date(),
      })
      .onConflict('email')
      .ignore()
    // An ignored insert has no id.
    if (!id) return 'taken'
    await recordHistory(trx, {
      userId: byUserId,
      action: 'added person',
      subject: person.email,
      after: person,
    })
    return { id }
  })
}

export type PersonRefusal = 'unknown person' | 'last administrator' | 'has left'

/** The person, locked, with the other administrators, so that two requests cannot remove the last two at once. */
async function lockedPerson(
  trx: Database,
  userId: number,
): Promise<{ row?: UserRow; otherAdministrators: number }> {
  const administrators = await trx<UserRow>('users')
    .where({ is_administrator: 1 })
    .whereNull('left_at')
    .orderBy('id')
    .forUpdate()
    .select('id')
  const row = await trx<UserRow>('users').where({ id: userId }).forUpdate().first()
  return { row, otherAdministrators: administrators.filter(({ id }) => id !== userId).length }
}

/**
 * Makes somebody an administrator, or no longer one. Their sessions end, since their rights changed.
 * Without `byUserId` it is done by whoever runs the server.
 */
export async function setAdministrator(
  db: Database,
  userId: number,
  isAdministrator: boolean,
  byUserId?: number,
): Promise<PersonRefusal | undefined> {
  return db.transaction(async (trx) => {
    const { row, otherAdministrators } = await lockedPerson(trx, userId)
    if (!row) return 'unknown person'
    if (row.left_at) return 'has left'
    if (Boolean(row.is_administrator) === isAdministrator) return undefined
    if (!isAdministrator && otherAdministrators === 0) return 'last administrator'
    await trx('users').where({ id: userId }).update({ is_administrator: isAdministrator })
    await endSessionsOf(trx, userId)
    await recordHistory(trx, {
      userId: byUserId,
      action: isAdministrator ? 'made administrator' : 'ended administrator',
      subject: row.email,
    })
    return undefined
  })
}

/** Marks somebody as left: no sign-in any more, every membership and session ends. */
export async function markAsLeft(
  db: Database,
  userId: number,
  byUserId?: number,
): Promise<PersonRefusal | undefined> {
  return db.transaction(async (trx) => {
    const { row, otherAdministrators } = await lockedPerson(trx, userId)
    if (!row) return 'unknown person'
    if (row.left_at) return undefined
    if (row.is_administrator && otherAdministrators === 0) return 'last administrator'
    const now = new Date()
    await trx('users').where({ id: userId }).update({ left_at: now, is_administrator: false })
    await endSessionsOf(trx, userId)
    const memberships = await trx('members')
      .where({ user_id: userId })
      .whereNull('to_at')
      .forUpdate()
      .select<{ id: number; project_id: number; role: string }[]>('id', 'project_id', 'role')
    for (const membership of memberships) {
      await trx('members').where({ id: membership.id }).update({ to_at: now })
      await recordHistory(trx, {
        projectId: membership.project_id,
        userId: byUserId,
        action: 'ended membership',
        subject: row.email,
        before: { role: membership.role },
        reason: 'left the firm',
      })
    }
    await recordHistory(trx, { userId: byUserId, action: 'marked as left', subject: row.email })
    return undefined
  })
}

/** Lets somebody who left sign in again; memberships and administrator's rights do not come back by themselves. */
export async function bringBack(
  db: Database,
  userId: number,
  byUserId: number,
): Promise<PersonRefusal | undefined> {
  return db.transaction(async (trx) => {
    const row = await trx<UserRow>('users').where({ id: userId }).forUpdate().first()
    if (!row) return 'unknown person'
    if (!row.left_at) return undefined
    await trx('users').where({ id: userId }).update({ left_at: null })
    await recordHistory(trx, { userId: byUserId, action: 'brought back', subject: row.email })
    return undefined
  })
}
