import { RouterContextProvider } from 'react-router'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { forgetOldModelSolves } from '../../app/heads/model-solves.server'
import { cancelJob, jobEnded } from '../../app/jobs/jobs.server'
import { loader as jobLoader } from '../../app/routes/api/job'
import { action, loader } from '../../app/routes/api/solve'
import type { Model } from '../../app/solver/model'
import { type FreshDatabase, freshDatabase } from '../database'
import { makePerson, signIn } from '../people'

let fresh: FreshDatabase
let cookie: string
let otherCookie: string
beforeAll(async () => {
  fresh = await freshDatabase()
  cookie = await signIn(fresh.database, await makePerson(fresh.database, { name: 'R. Oyelaran' }))
  otherCookie = await signIn(fresh.database, await makePerson(fresh.database, { name: 'Somebody Else' }))
})
afterAll(() => fresh.close())

/** Heads fall evenly from 12 in the west to 10 in the east. */
function strip(over: Partial<Model> = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 100], y: [0, 60] },
    grid: { columns: 20, rows: 12 },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 10, ky: 10 }],
    ground: [{ material: 'Sand', base: -10, top: 0 }],
    boundaries: [
      {
        name: 'West',
        kind: 'fixed head',
        line: [
          [0, 0],
          [0, 60],
        ],
        head: 12,
      },
      {
        name: 'East',
        kind: 'fixed head',
        line: [
          [100, 0],
          [100, 60],
        ],
        head: 10,
      },
    ],
    points: [{ name: 'P1', x: 50, y: 30 }],
    ...over,
  }
}
const endless = strip({ grid: { columns: 1000, rows: 600 } })

async function caught(work: () => Response | Promise<Response>): Promise<Response> {
  try {
    return await work()
  } catch (thrown) {
    if (thrown instanceof Response) return thrown
    throw thrown
  }
}

function post(body: string, headers: Record<string, string> = {}) {
  const request = new Request('http://127.0.0.1:3000/api/v1/solve', {
    method: 'POST',
    body,
    headers: {
      cookie,
      'content-type': 'application/json',
      'sec-fetch-site': 'same-origin',
      prefer: 'wait=20',
      ...headers,
    },
  })
  const context = new RouterContextProvider()
  return caught(() =>
    action({ request, context, params: {}, pattern: '', url: new URL(request.url) } as never),
  )
}
function solve(model: unknown, headers?: Record<string, string>) {
  return post(JSON.stringify(model), headers)
}
function job(jobId: number | string, headers: Record<string, string> = { cookie }) {
  const request = new Request(`http://127.0.0.1:3000/api/v1/jobs/${jobId}`, { headers })
  return caught(() =>
    jobLoader({
      request,
      context: new RouterContextProvider(),
      params: { jobId: String(jobId) },
      pattern: '',
      url: new URL(request.url),
    } as never),
  )
}
const errorOf = async (response: Response) =>
  ((await response.json()) as { errors: { path: string | null; message: string }[] }).errors[0]

describe('POST /api/v1/solve', () => {
  it('answers a model that is solved soon with its result', async () => {
    const response = await solve(strip())
    expect(response.status).toBe(200)
    const result = await response.json()
    expect(result).toMatchObject({ format: 'lavant-result', converged: true })
    expect(result.input).toMatch(/^sha256:[0-9a-f]{64}$/)
    expect(result.points[0].head[0]).toBeCloseTo(11, 6)
  })

  it('answers a model in time with one entry a stage', async () => {
    const response = await solve(
      strip({
        materials: [{ name: 'Sand', kx: 10, ky: 10, specificStorage: 1e-2 }],
        time: { kind: 'transient', initialHead: 10, stages: [{ duration: 0.1 }, { duration: 100 }] },
        solver: { method: 'multigrid' },
      }),
    )
    expect(response.status).toBe(200)
    const result = await response.json()
    expect(result).toMatchObject({ converged: true, method: 'multigrid', times: [0.1, 100.1] })
    expect(result.points[0].head[0]).toBeLessThan(10.9)
    expect(result.points[0].head[1]).toBeCloseTo(11, 3)
    expect(result.balance.volumes.storage).toHaveLength(2)
  })

  it('answers a longer one with the address of its job, which its owner alone may see', async () => {
    const response = await solve(endless, { prefer: 'wait=0' })
    expect(response.status).toBe(202)
    const { job: jobId, address } = await response.json()
    expect(address).toBe(`/api/v1/jobs/${jobId}`)
    expect(response.headers.get('Location')).toBe(address)
    expect(await (await job(jobId)).json()).toMatchObject({ job: jobId, result: null, error: null })
    expect((await job(jobId, { cookie: otherCookie })).status).toBe(404)
    expect((await job(jobId, {})).status).toBe(401)
    await cancelJob(jobId)
    await jobEnded(jobId)
    expect(await (await job(jobId)).json()).toMatchObject({
      state: 'cancelled',
      result: null,
      error: { path: null, message: 'It was cancelled.' },
    })
  })

  it('keeps the result of a job for a day', async () => {
    const { job: jobId } = await (await solve(strip(), { prefer: 'wait=0' })).json()
    await jobEnded(jobId)
    const done = await (await job(jobId)).json()
    expect(done).toMatchObject({ state: 'done', progress: null, error: null, result: { converged: true } })
    await forgetOldModelSolves(fresh.database, new Date(Date.now() + 23 * 3_600_000))
    expect((await (await job(jobId)).json()).result).not.toBeNull()
    await forgetOldModelSolves(fresh.database, new Date(Date.now() + 25 * 3_600_000))
    expect(await (await job(jobId)).json()).toMatchObject({
      result: null,
      error: { message: expect.stringContaining('24 hours') },
    })
  })

  it('refuses with 401 somebody who is signed out, and with 403 the page of another site', async () => {
    expect((await solve(strip(), { cookie: '' })).status).toBe(401)
    expect((await solve(strip(), { 'sec-fetch-site': 'cross-site' })).status).toBe(403)
  })

  it('refuses with 405 any other method, and with 415 anything but JSON', async () => {
    expect(loader().status).toBe(405)
    expect((await post('format=lavant-model', { 'content-type': 'text/plain' })).status).toBe(415)
  })

  it('refuses with 413 more than 8 MB, announced or not', async () => {
    const large = JSON.stringify(strip({ title: 'x'.repeat(8 * 1024 * 1024) }))
    expect((await post(large)).status).toBe(413)
    const request = new Request('http://127.0.0.1:3000/api/v1/solve', {
      method: 'POST',
      body: new Blob([large]).stream(),
      duplex: 'half',
      headers: { cookie, 'content-type': 'application/json', 'sec-fetch-site': 'same-origin' },
    } as RequestInit)
    const context = new RouterContextProvider()
    const response = await caught(() => action({ request, context, params: {} } as never))
    expect(response.status).toBe(413)
  })

  it('refuses with 400 what is no JSON and no model file, naming each place', async () => {
    expect((await post('{"format":')).status).toBe(400)
    const response = await solve({ ...strip(), colour: 'red', flow: 'both' })
    expect(response.status).toBe(400)
    const { errors } = await response.json()
    expect(errors.map((error: { path: string }) => error.path).sort()).toEqual(['colour', 'flow'])
  })

  it('refuses with 422 a model that cannot be computed, with the place in it', async () => {
    const section = await solve(
      strip({ time: { kind: 'transient', initialHead: 1, stages: [{ duration: 1 }] } }),
    )
    expect(section.status).toBe(422)
    expect(await errorOf(section)).toMatchObject({ path: 'materials[0].specificStorage' })
    const outside = await solve(
      strip({ wells: [{ name: 'W1', x: 500, y: 0, kind: 'abstraction', rate: 1 }] }),
    )
    expect(outside.status).toBe(422)
    expect((await errorOf(outside))?.path).toMatch(/^wells\[0\]/)
  })

  it('refuses with 422 more than a million cells before anything is queued', async () => {
    for (const grid of [{ columns: 1001, rows: 1000 }, { cellSize: 0.05 }] as Model['grid'][]) {
      const response = await solve(strip({ grid }))
      expect(response.status).toBe(422)
      expect(await errorOf(response)).toMatchObject({ path: 'grid' })
    }
  })

  it('refuses with 429 a third solve while two of the same person are under way', async () => {
    const open = []
    for (let i = 0; i < 2; i++) open.push((await (await solve(endless, { prefer: 'wait=0' })).json()).job)
    const response = await solve(strip(), { prefer: 'wait=0' })
    expect(response.status).toBe(429)
    expect(Number(response.headers.get('Retry-After'))).toBeGreaterThan(0)
    for (const jobId of open) await cancelJob(jobId)
    for (const jobId of open) await jobEnded(jobId)
  })
})
