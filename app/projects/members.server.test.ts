import { afterAll, beforeAll, beforeEach, expect, test, vi } from 'vitest'
import { environment } from '~/environment.server'
import { findSession } from '~/sign-in/sessions.server'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson, makeProject, signIn } from '../../test/people'
import { recentHistory } from './history.server'
import {
  appointManager,
  changeRole,
  endMembership,
  inviteMember,
  listMembers,
  mailInvitation,
} from './members.server'
import { bringBack, markAsLeft, setAdministrator } from './people.server'

const posted = vi.hoisted(() => [] as { to: string; subject: string; text: string }[])
vi.mock('~/mail/mail.server', () => ({
  sendMail: async (mail: { to: string; subject: string; text: string }) => {
    posted.push(mail)
  },
}))

let db: FreshDatabase
let manager: number
let originator: number
let project: number
let count = 0
beforeAll(async () => {
  db = await freshDatabase()
  manager = await makePerson(db.database, { name: 'Manager' })
  originator = await makePerson(db.database, { name: 'Originator' })
})
afterAll(() => db.close())
beforeEach(async () => {
  posted.length = 0
  project = await makeProject(db.database, {
    number: `M-${++count}`,
    createdBy: manager,
    members: [
      [manager, 'project manager'],
      [originator, 'originator'],
    ],
  })
})

const isSignedIn = async (cookie: string) =>
  (await findSession(db.database, new Request('http://lavant.test/', { headers: { cookie } }))) !== undefined

const roleOf = async (userId: number) =>
  (await listMembers(db.database, project)).find((line) => line.userId === userId)?.role

test('Inviting an unknown address adds the person, shows them as not signed in yet, and mails the configured address', async () => {
  const invitation = { email: 'new@client.test', name: 'New Client', role: 'client' as const }
  const answer = await inviteMember(db.database, project, invitation, manager)
  if (!answer.ok) throw new Error(answer.refusal)
  const line = (await listMembers(db.database, project)).find(({ userId }) => userId === answer.userId)
  expect(line).toMatchObject({ name: 'New Client', role: 'client', hasSignedIn: false })
  await mailInvitation(db.database, project, answer.userId, 'Manager')
  expect(posted).toHaveLength(1)
  expect(posted[0]?.to).toBe('new@client.test')
  expect(posted[0]?.text).toContain(`${environment().address}/sign-in`)
})

test('An unknown address without a name is asked for one, and nothing is kept', async () => {
  const answer = await inviteMember(
    db.database,
    project,
    { email: 'who@client.test', role: 'client' },
    manager,
  )
  expect(answer).toEqual({ ok: false, refusal: 'name needed' })
  expect(await db.database('users').where({ email: 'who@client.test' })).toEqual([])
})

test('Inviting twice, even at the same moment, makes one membership', async () => {
  const invitation = { email: 'twice@firm.test', name: 'Twice', role: 'checker' as const }
  const answers = await Promise.all(
    [1, 2, 3].map(() => inviteMember(db.database, project, invitation, manager)),
  )
  expect(answers.filter((answer) => answer.ok && answer.isNew)).toHaveLength(1)
  expect(
    (await listMembers(db.database, project)).filter(({ email }) => email === 'twice@firm.test'),
  ).toHaveLength(1)
})

test('An invitation does not change the role that a member has', async () => {
  const invitation = { email: 'originator@firm.test', role: 'checker' as const }
  expect(await inviteMember(db.database, project, invitation, manager)).toEqual({
    ok: false,
    refusal: 'has another role',
  })
  expect(await roleOf(originator)).toBe('originator')
})

test('A role change ends the sessions of that person at once, and of nobody else', async () => {
  const [theirs, mine] = [await signIn(db.database, originator), await signIn(db.database, manager)]
  const change = { userId: originator, seen: 'originator' as const, role: 'data' as const }
  expect(await changeRole(db.database, project, change, manager)).toBeUndefined()
  expect(await roleOf(originator)).toBe('data')
  expect(await isSignedIn(theirs)).toBe(false)
  expect(await isSignedIn(mine)).toBe(true)
  const closed = await db
    .database('members')
    .where({ project_id: project, user_id: originator })
    .whereNotNull('to_at')
  expect(closed.map((row) => row.role)).toEqual(['originator'])
})

test('A role that somebody else changed meanwhile is not overwritten', async () => {
  await changeRole(db.database, project, { userId: originator, seen: 'originator', role: 'data' }, manager)
  const late = { userId: originator, seen: 'originator' as const, role: 'checker' as const }
  expect(await changeRole(db.database, project, late, manager)).toBe('changed meanwhile')
  expect(await roleOf(originator)).toBe('data')
})

test('Removal from a project ends the sessions of that person at once', async () => {
  const cookie = await signIn(db.database, originator)
  expect(await endMembership(db.database, project, originator, manager)).toBeUndefined()
  expect(await roleOf(originator)).toBeUndefined()
  expect(await isSignedIn(cookie)).toBe(false)
  expect(await endMembership(db.database, project, originator, manager)).toBe('not a member')
})

test('The last project manager neither leaves nor takes another role', async () => {
  expect(await endMembership(db.database, project, manager, manager)).toBe('last project manager')
  const change = { userId: manager, seen: 'project manager' as const, role: 'approver' as const }
  expect(await changeRole(db.database, project, change, manager)).toBe('last project manager')
  expect(await roleOf(manager)).toBe('project manager')
})

test('Two project managers who remove each other at the same moment leave one', async () => {
  const second = await makePerson(db.database, { name: `Second ${project}` })
  await appointManager(db.database, project, second, manager)
  const answers = await Promise.all([
    endMembership(db.database, project, manager, second),
    endMembership(db.database, project, second, manager),
  ])
  expect(answers.filter((answer) => answer === 'last project manager')).toHaveLength(1)
})

test('A member of one project is not reached through another', async () => {
  const other = await makeProject(db.database, {
    number: `O-${count}`,
    createdBy: manager,
    members: [[manager, 'project manager']],
  })
  expect(await endMembership(db.database, other, originator, manager)).toBe('not a member')
  const change = { userId: originator, seen: 'originator' as const, role: 'client' as const }
  expect(await changeRole(db.database, other, change, manager)).toBe('not a member')
  expect(await mailInvitation(db.database, other, originator, 'Manager')).toBe('not a member')
  expect(await roleOf(originator)).toBe('originator')
})

test('Whoever leaves the firm loses sessions and memberships, and comes back with neither', async () => {
  const lee = await makePerson(db.database, { name: `Lee ${project}` })
  const administrator = await makePerson(db.database, { name: `Admin ${project}`, isAdministrator: true })
  await inviteMember(db.database, project, { email: `lee.${project}@firm.test`, role: 'checker' }, manager)
  expect(await roleOf(lee)).toBe('checker')
  const cookie = await signIn(db.database, lee)
  await markAsLeft(db.database, lee, administrator)
  expect(await isSignedIn(cookie)).toBe(false)
  expect(await roleOf(lee)).toBeUndefined()
  const again = await inviteMember(
    db.database,
    project,
    { email: `lee.${project}@firm.test`, role: 'checker' },
    manager,
  )
  expect(again).toEqual({ ok: false, refusal: 'has left' })
  await bringBack(db.database, lee, administrator)
  expect(await isSignedIn(cookie)).toBe(false)
  expect(await roleOf(lee)).toBeUndefined()
})

test('The firm keeps one administrator, even when two step down at the same moment', async () => {
  await db.database('users').update({ is_administrator: false })
  const [one, two] = [
    await makePerson(db.database, { name: `One ${project}`, isAdministrator: true }),
    await makePerson(db.database, { name: `Two ${project}`, isAdministrator: true }),
  ]
  const answers = await Promise.all([
    setAdministrator(db.database, one, false, one),
    markAsLeft(db.database, two, two),
  ])
  expect(answers.filter((answer) => answer === 'last administrator')).toHaveLength(1)
  expect(await db.database('users').where({ is_administrator: true })).toHaveLength(1)
})

test('Every change of members is in the history, with who and from what', async () => {
  await changeRole(db.database, project, { userId: originator, seen: 'originator', role: 'data' }, manager)
  await endMembership(db.database, project, originator, manager)
  const lines = await recentHistory(db.database, project)
  expect(lines.map((line) => [line.action, line.subject, line.person])).toEqual([
    ['ended membership', 'originator@firm.test', 'Manager'],
    ['changed role', 'originator@firm.test', 'Manager'],
  ])
})

test('An invitation is mailed five times an hour at most', async () => {
  const invitation = { email: `many.${project}@client.test`, name: 'Many', role: 'client' as const }
  const answer = await inviteMember(db.database, project, invitation, manager)
  if (!answer.ok) throw new Error(answer.refusal)
  for (let index = 0; index < 5; index++) await mailInvitation(db.database, project, answer.userId, 'Manager')
  expect(await mailInvitation(db.database, project, answer.userId, 'Manager')).toMatchObject({
    waitSeconds: expect.any(Number),
  })
  expect(posted).toHaveLength(5)
})
