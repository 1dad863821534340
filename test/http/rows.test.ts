import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { type FreshDatabase, freshDatabase } from '../database.ts'
import { makePerson, makeProject, signIn } from '../people.ts'
import { type Application, builtApplication } from './application.ts'

let db: FreshDatabase
let application: Application
let projectId: number
let cookies: Record<string, string>

beforeAll(async () => {
  db = await freshDatabase()
  application = await builtApplication()
  const originator = await makePerson(db.database, { name: 'Originator' })
  const data = await makePerson(db.database, { name: 'Data' })
  projectId = await makeProject(db.database, {
    number: 'ROWS',
    createdBy: originator,
    members: [
      [originator, 'originator'],
      [data, 'data'],
    ],
  })
  cookies = {
    originator: await signIn(db.database, originator),
    data: await signIn(db.database, data),
  }
}, 600_000)
afterAll(() => db.close())

function post(person: string, body: string, headers: Record<string, string> = {}) {
  return application(`/projects/${projectId}/rows`, {
    method: 'POST',
    body,
    headers: {
      cookie: cookies[person] ?? '',
      accept: 'application/json',
      'content-type': 'application/json',
      'sec-fetch-site': 'same-origin',
      ...headers,
    },
  })
}

const well = { name: 'W1', x: 1, y: 2, kind: 'abstraction', rate: { value: 12, unit: 'gpm' } }

function adding(id: string, body: unknown = well) {
  return JSON.stringify({ changes: [{ op: 'add', kind: 'well', id, body }] })
}

describe('the route that saves rows', () => {
  it('answers with the new version, then with both values to whoever saw an older one', async () => {
    const first = await post('originator', adding('w1'))
    expect([first.status, await first.json()]).toEqual([200, { ok: true, rows: [{ id: 'w1', version: 1 }] }])
    const late = await post('originator', adding('w1', { ...well, name: 'Other' }))
    expect(late.status).toBe(409)
    expect(await late.json()).toMatchObject({ conflicts: [{ theirs: { version: 1, by: 'Originator' } }] })
  })

  it('names the cell that cannot stand', async () => {
    const answer = await post('originator', adding('w2', { ...well, kind: 'injection' }))
    expect(answer.status).toBe(400)
    expect(await answer.json()).toMatchObject({ problems: [{ id: 'w2', field: 'kind' }] })
  })

  it('names the section that a role may not edit', async () => {
    const answer = await post('data', adding('w3'))
    expect(answer.status).toBe(403)
    expect(await answer.text()).toContain('may not edit water')
  })

  it("refuses what another site's page sends", async () => {
    const answer = await post('originator', adding('w4'), { 'sec-fetch-site': 'cross-site' })
    expect(answer.status).toBe(403)
  })

  it('takes JSON only, and no more than 2 MB of it', async () => {
    expect((await post('originator', adding('w5'), { 'content-type': 'text/plain' })).status).toBe(415)
    expect((await post('originator', adding('w5', { ...well, source: 'x'.repeat(2_200_000) }))).status).toBe(
      413,
    )
    expect((await post('originator', '{"changes": [')).status).toBe(400)
    expect((await post('originator', '{"changes": []}')).status).toBe(400)
  })

  it('left nothing behind of what it refused', async () => {
    expect(await db.database('book_rows').where({ project_id: projectId }).pluck('id')).toEqual(['w1'])
  })
})
