import { afterAll, beforeAll, expect, test } from 'vitest'
import { type FreshDatabase, freshDatabase } from '../database.ts'
import { signIn } from '../people.ts'
import { type Application, builtApplication } from './application.ts'
import { makeWorld, type World } from './world.ts'

const secret = 'wordthatnoclientmayread'

let db: FreshDatabase
let application: Application
let world: World
beforeAll(async () => {
  db = await freshDatabase()
  application = await builtApplication()
  world = await makeWorld(db.database)
  await hideSecrets()
}, 600_000)
afterAll(() => db.close())

/** Puts the secret word wherever colleagues write to one another: sources, remarks, reasons, errors, drafts. */
async function hideSecrets(): Promise<void> {
  const { database } = db
  const projectId = Number(world.own.projectId)
  const userId = world.people.originator
  const now = new Date()
  const [instrument] = await database('book_rows').where({ project_id: projectId, kind: 'instrument' })
  const body = typeof instrument.body === 'string' ? JSON.parse(instrument.body) : instrument.body
  await database('book_rows')
    .where({ project_id: projectId, kind: 'instrument' })
    .update({ body: JSON.stringify({ ...body, serial: secret, source: secret }) })
  const rows = [
    ['basis', 'assumption', { reference: 'A1', statement: secret, why: secret, effect: secret }],
    [
      'water',
      'well',
      { name: 'W9', x: 1, y: 1, kind: 'abstraction', rate: { value: 1, unit: 'L/s' }, source: secret },
    ],
    ['cover', 'remark', { text: secret }],
  ] as const
  for (const [index, [section, kind, content]] of rows.entries()) {
    await database('book_rows').insert({
      project_id: projectId,
      id: `secret-${index}`,
      version: 1,
      section,
      kind,
      position: index,
      body: JSON.stringify(content),
      recorded_from: now,
      recorded_by: userId,
    })
  }
  await database('history').insert({
    project_id: projectId,
    at: now,
    user_id: userId,
    action: secret,
    subject: secret,
    before: JSON.stringify({ note: secret }),
    reason: secret,
  })
  // What an issued package holds is read for its predicted heads, and for nothing else.
  const gathered = {
    assumptions: [{ statement: secret }],
    fit: { date: null, statistics: null, lines: [{ name: 'SP1', modelled: 1, remark: secret }] },
  }
  await database('packages')
    .where({ project_id: projectId })
    .update({ reason: secret, gathered: JSON.stringify(gathered) })
  await database('packages').where({ id: world.draftPackageId }).update({ purpose: secret, revision: 'P99' })
  await database('runs').where({ project_id: projectId }).update({ error: secret, case_name: secret })
  await database('imports').where({ project_id: projectId }).update({ error: secret })
  await database('files')
    .where({ project_id: projectId, kind: 'readings' })
    .update({ name: `${secret}.csv` })
}

test('No page or answer that a client can get holds a word that colleagues wrote to one another', async () => {
  const base = `/projects/${world.own.projectId}`
  const cookie = await signIn(db.database, world.people.client)
  const pages = ['/', '/projects', '/account', base, `${base}/progress`, `${base}/cover`, `${base}/history`]
  for (const page of pages) {
    const background = page === '/' ? '/_.data' : `${page}.data`
    const layoutOnly = `${background}?_routes=routes%2Fproject%2Flayout`
    for (const target of [page, background, layoutOnly]) {
      const response = await application(target, { headers: { cookie, accept: 'text/html' } })
      const text = await response.text()
      expect(text, target).not.toContain(secret)
      expect(text, target).not.toContain('P99')
    }
  }
  const progress = await application(`${base}/progress`, { headers: { cookie } })
  expect(progress.status).toBe(200)
})

test('The words are there for a colleague to read', async () => {
  const cookie = await signIn(db.database, world.people.checker)
  const response = await application(`/projects/${world.own.projectId}/history`, { headers: { cookie } })
  expect(await response.text()).toContain(secret)
})
