import { createHash, randomUUID } from 'node:crypto'
import { RouterContextProvider } from 'react-router'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { saveRows } from '../../app/book/rows.server'
import { jobEnded } from '../../app/jobs/jobs.server'
import { findMembership, membershipContext } from '../../app/projects/guard.server'
import type { Role } from '../../app/projects/permissions'
import { loader as casesLoader } from '../../app/routes/project/cases'
import { action as runAction, loader as runLoader } from '../../app/routes/project/run'
import { loader as headsLoader } from '../../app/routes/project/run-heads'
import { loader as modelLoader } from '../../app/routes/project/run-model'
import { action as startAction } from '../../app/routes/project/runs'
import { rowKinds } from '../../app/row-kinds.server'
import { signedInContext } from '../../app/sign-in/guard.server'
import { type FreshDatabase, freshDatabase } from '../database'
import { makePerson, makeProject } from '../people'

let fresh: FreshDatabase
const people = {} as Record<Role | 'elsewhere', number>
let project: number
let otherProject: number
const caseId = randomUUID()
let runId: number

beforeAll(async () => {
  fresh = await freshDatabase()
  const db = fresh.database
  for (const role of ['originator', 'checker', 'client', 'elsewhere'] as const)
    people[role] = await makePerson(db, { name: role })
  const by = people.originator
  project = await makeProject(db, {
    number: 'P-1',
    createdBy: by,
    members: [
      [by, 'originator'],
      [people.checker, 'checker'],
      [people.client, 'client'],
    ],
  })
  otherProject = await makeProject(db, {
    number: 'P-2',
    createdBy: by,
    members: [[people.elsewhere, 'originator']],
  })
  const sand = randomUUID()
  const k = { value: 10, unit: 'm/d' }
  const m = (value: number) => ({ value, unit: 'm' })
  const add = (kind: string, body: object, id: string = randomUUID()) =>
    ({ op: 'add', kind, id, body }) as const
  for (const changes of [
    [add('material', { name: 'Sand', kx: k, ky: k }, sand)],
    [
      add('zone', { name: 'Everywhere', materialId: sand, base: m(-10), top: m(0) }),
      add('boundary', {
        name: 'West',
        kind: 'fixed head',
        line: [
          [0, 0],
          [0, 600],
        ],
        levels: [m(12)],
      }),
      add(
        'case',
        {
          name: 'Base case',
          isBase: true,
          flow: 'confined',
          extent: { xMin: 0, xMax: 1000, yMin: 0, yMax: 600 },
          cellSize: m(50),
        },
        caseId,
      ),
    ],
  ]) {
    const saved = await saveRows(db, { projectId: project, userId: by, changes, kinds: rowKinds })
    if (!saved.ok) throw new Error(JSON.stringify(saved))
  }
})
afterAll(() => fresh.close())

async function asked(
  who: Role | 'elsewhere',
  work: (args: never) => unknown,
  options: {
    inProject?: number
    runId?: number | string
    form?: Record<string, string>
    headers?: HeadersInit
  } = {},
): Promise<{ status: number; body: Response | Record<string, unknown> }> {
  const { inProject = project, form, headers } = options
  const request = new Request(`http://127.0.0.1:3000/projects/${inProject}/runs`, {
    headers,
    ...(form ? { method: 'POST', body: new URLSearchParams(form) } : {}),
  })
  const context = new RouterContextProvider()
  context.set(signedInContext, { userId: people[who], name: who, email: '', isAdministrator: false })
  try {
    context.set(membershipContext, await findMembership(context, String(inProject)))
    const params = { projectId: String(inProject), runId: String(options.runId ?? runId) }
    const answer = await work({ request, context, params } as never)
    if (answer instanceof Response) return { status: answer.status, body: answer }
    const wrapped = answer as { data: Record<string, unknown>; init?: ResponseInit }
    return { status: wrapped.init?.status ?? 200, body: wrapped.data }
  } catch (thrown) {
    if (thrown instanceof Response) return { status: thrown.status, body: thrown }
    throw thrown
  }
}
const response = (body: unknown) => body as Response

describe('The runs of a project', () => {
  it('are started by the originator, and by nobody else', async () => {
    const form = { caseId }
    expect((await asked('checker', startAction, { form })).status).toBe(403)
    expect((await asked('client', startAction, { form })).status).toBe(404)
    expect((await asked('elsewhere', startAction, { form })).status).toBe(404)
    expect((await asked('originator', startAction, { form: {} })).status).toBe(400)
    const gone = await asked('originator', startAction, { form: { caseId: randomUUID() } })
    expect(gone).toMatchObject({ status: 400, body: { ok: false, problems: [{ section: 'cases' }] } })

    const started = await asked('originator', startAction, { form })
    expect(started).toMatchObject({ status: 201, body: { ok: true, number: 1, alreadyUnderWay: false } })
    const body = started.body as { runId: number; jobId: number }
    runId = body.runId
    await jobEnded(body.jobId)
  })

  it('tell the team how they stand, and a client nothing', async () => {
    const state = await asked('checker', runLoader)
    expect(await response(state.body).json()).toMatchObject({
      id: runId,
      number: 1,
      state: 'done',
      converged: true,
    })
    for (const loader of [runLoader, headsLoader, modelLoader])
      expect((await asked('client', loader)).status).toBe(404)
  })

  it('give out their head field with its SHA-256, as a download that is never a page', async () => {
    const { body } = await asked('checker', headsLoader)
    const answer = response(body)
    const bytes = Buffer.from(await answer.arrayBuffer())
    const etag = answer.headers.get('ETag')
    expect(etag).toBe(`"${createHash('sha256').update(bytes).digest('hex')}"`)
    expect(answer.headers.get('Content-Disposition')).toMatch(/^attachment/)
    expect(answer.headers.get('X-Content-Type-Options')).toBe('nosniff')
    expect(answer.headers.get('Content-Security-Policy')).toMatch(/^sandbox/)
    const again = await asked('checker', headsLoader, { headers: { 'if-none-match': etag ?? '' } })
    expect(again.status).toBe(304)
  })

  it('give out the model file that they froze', async () => {
    const answer = response((await asked('checker', modelLoader)).body)
    const text = await answer.text()
    expect(JSON.parse(text)).toMatchObject({ format: 'lavant-model', units: { length: 'm', time: 'd' } })
    expect(answer.headers.get('Lavant-Input-SHA256')).toBe(createHash('sha256').update(text).digest('hex'))
  })

  it('are not found through another project, nor by an id that is no number', async () => {
    for (const work of [runLoader, headsLoader, modelLoader])
      expect((await asked('elsewhere', work, { inProject: otherProject })).status).toBe(404)
    for (const intent of ['cancel', 'again']) {
      const answer = await asked('elsewhere', runAction, { inProject: otherProject, form: { intent } })
      expect(answer.status).toBe(404)
    }
    expect((await asked('checker', runLoader, { runId: 'x' })).status).toBe(404)
  })

  it('are computed again from the same input by the originator, and cannot be cancelled once done', async () => {
    expect((await asked('checker', runAction, { form: { intent: 'again' } })).status).toBe(403)
    expect((await asked('originator', runAction, { form: { intent: 'erase' } })).status).toBe(400)
    expect(await asked('originator', runAction, { form: { intent: 'cancel' } })).toMatchObject({
      status: 200,
      body: { cancelled: false },
    })
    const again = await asked('originator', runAction, { form: { intent: 'again' } })
    expect(again).toMatchObject({ status: 201, body: { ok: true, number: 2 } })
    await jobEnded((again.body as unknown as { jobId: number }).jobId)
  })

  it('are listed on the page of cases, for the team only', async () => {
    const context = new RouterContextProvider()
    context.set(signedInContext, { userId: people.checker, name: '', email: '', isAdministrator: false })
    context.set(membershipContext, await findMembership(context, String(project)))
    const page = await casesLoader({ context } as never)
    expect(page).toMatchObject({ mayEdit: false, mayRun: false, mayCheck: true, followed: [] })
    expect(page.runs.map((run) => [run.number, run.state, run.stale])).toEqual([
      [2, 'done', false],
      [1, 'done', false],
    ])
    expect((await asked('client', casesLoader)).status).toBe(404)
  })
})
