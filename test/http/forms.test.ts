import { afterAll, beforeAll, beforeEach, expect, test } from 'vitest'
import { type FreshDatabase, freshDatabase } from '../database.ts'
import { makePerson, makeProject, signIn } from '../people.ts'
import { type Application, builtApplication } from './application.ts'

let db: FreshDatabase
let application: Application
let administrator: number
let manager: number
let projectId: number
let count = 0
beforeAll(async () => {
  db = await freshDatabase()
  application = await builtApplication()
  administrator = await makePerson(db.database, { name: 'Admin', isAdministrator: true })
}, 600_000)
afterAll(() => db.close())
beforeEach(async () => {
  manager = await makePerson(db.database, { name: `Manager ${++count}` })
  projectId = await makeProject(db.database, {
    number: `F-${count}`,
    createdBy: manager,
    members: [[manager, 'project manager']],
  })
})

async function post(userId: number, path: string, form: Record<string, string>) {
  const cookie = await signIn(db.database, userId)
  const response = await application(path, {
    method: 'POST',
    body: new URLSearchParams(form),
    headers: { accept: 'text/html', cookie },
  })
  return { status: response.status, location: response.headers.get('location'), html: await response.text() }
}

const settings = (number: string) => ({
  number,
  title: 'Basement & shaft',
  client: 'Client',
  calcReference: 'C-1',
  crsEpsg: '27700',
  verticalDatum: 'mOD',
  timeZone: 'Europe/London',
  lengthUnit: 'm',
  timeUnit: 'd',
})

test('A new project sent twice at the same moment is made once', async () => {
  const answers = await Promise.all([1, 2].map(() => post(administrator, '/projects/new', settings('TWICE'))))
  expect(answers.map((answer) => answer.status)).toEqual([302, 302])
  expect(answers[0]?.location).toBe(answers[1]?.location)
  expect(await db.database('projects').where({ number: 'TWICE' })).toHaveLength(1)
})

test('A number that another project has is refused, and what was entered stays', async () => {
  const answer = await post(administrator, '/projects/new', settings(`F-${count}`))
  expect(answer.status).toBe(400)
  expect(answer.html).toContain('Another project has this number.')
  expect(answer.html).toContain('value="Basement &amp; shaft"')
})

test.each([
  ['crsEpsg', '12', 'EPSG codes start at 1024.'],
  ['crsEpsg', 'British grid', 'Give the grid reference system as an EPSG code.'],
  ['timeZone', 'London', 'This is not a time zone name such as Europe/London.'],
  ['title', '   ', 'Give the project a title.'],
])('A new project with %s "%s" is refused in words', async (field, value, message) => {
  const answer = await post(administrator, '/projects/new', { ...settings('WRONG'), [field]: value })
  expect(answer.status).toBe(400)
  expect(answer.html).toContain(message)
  expect(await db.database('projects').where({ number: 'WRONG' })).toEqual([])
})

test('Settings that somebody else saved meanwhile are not overwritten', async () => {
  const path = `/projects/${projectId}/settings`
  const page = await application(path, { headers: { cookie: await signIn(db.database, manager) } })
  const seen = /name="seen" value="([0-9a-f]{16})"/.exec(await page.text())?.[1] ?? ''
  const form = { intent: 'settings', seen, ...settings(`F-${count}`) }
  expect((await post(manager, path, { ...form, title: 'First' })).status).toBe(200)
  const late = await post(manager, path, { ...form, title: 'Second' })
  expect(late.status).toBe(409)
  expect(late.html).toContain('value="Second"')
  const [row] = await db.database('projects').where({ id: projectId })
  expect(row.title).toBe('First')
})

test('A project manager invites, changes a role and ends a membership; the person is out at once', async () => {
  const path = `/projects/${projectId}/settings`
  const email = `client.${count}@client.test`
  expect((await post(manager, path, { intent: 'invite', email, role: 'client' })).html).toContain(
    'This address is new here: give the name as well.',
  )
  const invited = await post(manager, path, { intent: 'invite', email, name: 'Cleo', role: 'client' })
  expect(invited.status).toBe(200)
  expect(invited.html).toContain('not signed in yet')
  const [person] = await db.database('users').where({ email })
  const session = await signIn(db.database, person.id)
  const visit = () =>
    application(`/projects/${projectId}/progress`, { headers: { cookie: session, accept: 'text/html' } })
  expect((await visit()).status).toBe(200)
  const form = { intent: 'change role', userId: String(person.id), seen: 'client', role: 'checker' }
  expect((await post(manager, path, form)).status).toBe(200)
  expect((await visit()).status).toBe(302)
  expect((await post(manager, path, form)).status).toBe(200)
  const other = { ...form, role: 'approver' }
  expect((await post(manager, path, other)).status).toBe(409)
  expect((await post(manager, path, { intent: 'end membership', userId: String(person.id) })).status).toBe(
    200,
  )
  expect((await post(manager, path, { intent: 'end membership', userId: String(person.id) })).status).toBe(
    404,
  )
})

test('The last project manager is told why they cannot leave', async () => {
  const form = { intent: 'end membership', userId: String(manager) }
  const answer = await post(manager, `/projects/${projectId}/settings`, form)
  expect(answer.status).toBe(400)
  expect(answer.html).toContain('This is the last project manager')
})

test('The last administrator is told why they cannot step down', async () => {
  const form = { intent: 'end administrator', userId: String(administrator) }
  const answer = await post(administrator, '/people', form)
  expect(answer.status).toBe(400)
  expect(answer.html).toContain('This is the last administrator')
})

test('A person is added once, whatever the capitals of the address', async () => {
  const email = `Joan.${count}@Firm.test`
  expect((await post(administrator, '/people', { intent: 'add', name: 'Joan', email })).status).toBe(200)
  const again = await post(administrator, '/people', {
    intent: 'add',
    name: 'Joan',
    email: email.toLowerCase(),
  })
  expect(again.status).toBe(400)
  expect(again.html).toContain('Somebody with this address is here already.')
})

test('An administrator puts somebody in charge of a project without seeing its book', async () => {
  const other = await makePerson(db.database, { name: `Other ${count}` })
  const form = { intent: 'appoint', projectId: String(projectId), userId: String(other) }
  expect((await post(administrator, '/projects', form)).status).toBe(200)
  const cookie = await signIn(db.database, other)
  expect((await application(`/projects/${projectId}/settings`, { headers: { cookie } })).status).toBe(200)
  const own = await signIn(db.database, administrator)
  expect((await application(`/projects/${projectId}/settings`, { headers: { cookie: own } })).status).toBe(
    404,
  )
})
