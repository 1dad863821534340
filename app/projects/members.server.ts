import { environment } from '~/environment.server'
import { sendMail } from '~/mail/mail.server'
import { spend } from '~/sign-in/limits.server'
import { endSessionsOf } from '~/sign-in/sessions.server'
import type { Database } from '~database/connection.server'
import { recordHistory } from './history.server'
import { addPerson, findPersonByEmail } from './people.server'
import { type Role, roleNames } from './permissions'
import type { Invitation } from './person'
import { findProject } from './projects.server'

export interface MemberLine {
  userId: number
  name: string
  email: string
  role: Role
  since: Date
  /** False: invited, not signed in yet. */
  hasSignedIn: boolean
}

interface MemberRow {
  id: number
  project_id: number
  user_id: number
  role: Role
  from_at: Date
  to_at: Date | null
}

/** Who takes part in a project now, in the order of the roles. */
export async function listMembers(db: Database, projectId: number): Promise<MemberLine[]> {
  const rows = await db('members')
    .join('users', 'users.id', 'members.user_id')
    .where('members.project_id', projectId)
    .whereNull('members.to_at')
    // The column is an enumeration in the order of the table of roles.
    .orderBy('members.role')
    .orderBy('users.name')
    .select<
      {
        user_id: number
        name: string
        email: string
        role: Role
        from_at: Date
        first_signed_in_at: Date | null
      }[]
    >(
      'members.user_id',
      'users.name',
      'users.email',
      'members.role',
      'members.from_at',
      'users.first_signed_in_at',
    )
  return rows.map((row) => ({
    userId: row.user_id,
    name: row.name,
    email: row.email,
    role: row.role,
    since: row.from_at,
    hasSignedIn: row.first_signed_in_at !== null,
  }))
}

/** The open memberships of a project, with the project locked: changes of its members wait for one another. */
async function lockedMembers(trx: Database, projectId: number): Promise<MemberRow[]> {
  await trx('projects').where({ id: projectId }).forUpdate().first('id')
  return trx<MemberRow>('members').where({ project_id: projectId }).whereNull('to_at').forUpdate()
}

function isLastManager(members: MemberRow[], userId: number): boolean {
  const managers = members.filter((member) => member.role === 'project manager')
  return managers.length === 1 && managers[0]?.user_id === userId
}

async function startMembership(
  trx: Database,
  membership: { projectId: number; userId: number; role: Role; byUserId: number },
): Promise<void> {
  await trx('members').insert({
    project_id: membership.projectId,
    user_id: membership.userId,
    role: membership.role,
    from_at: new Date(),
    invited_by: membership.byUserId,
  })
}

export type InvitationAnswer =
  | { ok: true; userId: number; isNew: boolean }
  | { ok: false; refusal: 'name needed' | 'has left' | 'has another role' }

/**
 * Makes somebody a member; a person whom the firm does not know yet is added. Asked twice, it does nothing more
 * (isNew: false). Somebody who is a member in another role keeps it: a role is changed by its own form.
 */
export async function inviteMember(
  db: Database,
  projectId: number,
  invitation: Invitation,
  byUserId: number,
): Promise<InvitationAnswer> {
  return db.transaction(async (trx): Promise<InvitationAnswer> => {
    const members = await lockedMembers(trx, projectId)
    let person = await findPersonByEmail(trx, invitation.email)
    if (!person) {
      if (!invitation.name) return { ok: false, refusal: 'name needed' }
      await addPerson(trx, { name: invitation.name, email: invitation.email }, byUserId)
      person = await findPersonByEmail(trx, invitation.email)
      if (!person) throw new Error('The person who was just added is not there.')
    }
    if (person.leftAt) return { ok: false, refusal: 'has left' }
    const present = members.find((member) => member.user_id === person.id)
    if (present) {
      if (present.role !== invitation.role) return { ok: false, refusal: 'has another role' }
      return { ok: true, userId: person.id, isNew: false }
    }
    await startMembership(trx, { projectId, userId: person.id, role: invitation.role, byUserId })
    await recordHistory(trx, {
      projectId,
      userId: byUserId,
      action: 'invited member',
      subject: person.email,
      after: { role: invitation.role },
    })
    return { ok: true, userId: person.id, isNew: true }
  })
}

/**
 * Mails the invitation to a member. The address in it comes from the configuration.
 * Returns the seconds to wait when the person was mailed too often. Throws when the mail server refuses it.
 */
export async function mailInvitation(
  db: Database,
  projectId: number,
  userId: number,
  invitedBy: string,
): Promise<{ waitSeconds?: number } | 'not a member'> {
  const member = (await listMembers(db, projectId)).find((line) => line.userId === userId)
  const project = await findProject(db, projectId)
  if (!member || !project) return 'not a member'
  const waitSeconds = await spend('invitation to e-mail', member.email)
  if (waitSeconds !== undefined) return { waitSeconds }
  await sendMail({
    to: member.email,
    subject: `Invitation: ${project.number} ${project.title}`,
    text: [
      `Dear ${member.name},`,
      '',
      `${invitedBy} has made you a member of the project ${project.number} ${project.title}`,
      `as ${roleNames[member.role]}.`,
      '',
      `Sign in with this e-mail address at ${environment().address}/sign-in`,
      'There is no password: a code is sent to you each time.',
    ].join('\n'),
  })
  return {}
}

export type MemberRefusal = 'not a member' | 'last project manager' | 'changed meanwhile' | 'has left'

/**
 * Gives a member another role. `seen` is the role that the page showed; the person's sessions end at once.
 * The old membership closes and a new one opens, so that who held which role when can still be told.
 */
export async function changeRole(
  db: Database,
  projectId: number,
  change: { userId: number; seen: Role; role: Role },
  byUserId: number,
): Promise<MemberRefusal | undefined> {
  const { userId, seen, role } = change
  return db.transaction(async (trx) => {
    const members = await lockedMembers(trx, projectId)
    const member = members.find((row) => row.user_id === userId)
    if (!member) return 'not a member'
    if (member.role === role) return undefined
    if (member.role !== seen) return 'changed meanwhile'
    if (isLastManager(members, userId)) return 'last project manager'
    await trx('members').where({ id: member.id, project_id: projectId }).update({ to_at: new Date() })
    await startMembership(trx, { projectId, userId, role, byUserId })
    await endSessionsOf(trx, userId)
    await recordHistory(trx, {
      projectId,
      userId: byUserId,
      action: 'changed role',
      subject: await emailOf(trx, userId),
      before: { role: member.role },
      after: { role },
    })
    return undefined
  })
}

/** Ends a membership and, in the same transaction, the person's sessions. Ended already: nothing more happens. */
export async function endMembership(
  db: Database,
  projectId: number,
  userId: number,
  byUserId: number,
): Promise<MemberRefusal | undefined> {
  return db.transaction(async (trx) => {
    const members = await lockedMembers(trx, projectId)
    const member = members.find((row) => row.user_id === userId)
    if (!member) return 'not a member'
    if (isLastManager(members, userId)) return 'last project manager'
    await trx('members').where({ id: member.id, project_id: projectId }).update({ to_at: new Date() })
    await endSessionsOf(trx, userId)
    await recordHistory(trx, {
      projectId,
      userId: byUserId,
      action: 'ended membership',
      subject: await emailOf(trx, userId),
      before: { role: member.role },
    })
    return undefined
  })
}

/**
 * An administrator's way to put somebody in charge of a project: a member's role becomes project manager, anybody
 * else becomes a member. The administrator sees nothing of the book by that.
 */
export async function appointManager(
  db: Database,
  projectId: number,
  userId: number,
  byUserId: number,
): Promise<MemberRefusal | undefined> {
  return db.transaction(async (trx) => {
    const members = await lockedMembers(trx, projectId)
    const present = members.find((row) => row.user_id === userId)
    if (present?.role === 'project manager') return undefined
    const person = await trx('users').where({ id: userId }).whereNull('left_at').first('id')
    if (!person) return 'has left'
    if (present) await trx('members').where({ id: present.id }).update({ to_at: new Date() })
    await startMembership(trx, { projectId, userId, role: 'project manager', byUserId })
    if (present) await endSessionsOf(trx, userId)
    await recordHistory(trx, {
      projectId,
      userId: byUserId,
      action: 'appointed project manager',
      subject: await emailOf(trx, userId),
      before: present && { role: present.role },
    })
    return undefined
  })
}

async function emailOf(db: Database, userId: number): Promise<string> {
  const row = await db('users').where({ id: userId }).first<{ email: string } | undefined>('email')
  return row?.email ?? `person ${userId}`
}
