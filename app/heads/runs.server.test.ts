import { createHash, randomUUID } from 'node:crypto'
import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest'
import type { RowChange } from '~/book/row'
import { saveRows } from '~/book/rows.server'
import { sectionStates } from '~/book/sections.server'
import { casesKinds } from '~/cases/cases-kinds.server'
import { groundKinds } from '~/ground/ground-kinds.server'
import { cancelJob, findJob, jobEnded, markInterruptedJobs } from '~/jobs/jobs.server'
import { recentHistory } from '~/projects/history.server'
import type { Project } from '~/projects/project'
import { findProject } from '~/projects/projects.server'
import { decodeHeads } from '~/solver/heads-buffer'
import { waterKinds } from '~/water/water-kinds.server'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson, makeProject } from '../../test/people'
import {
  cancelRun,
  findRun,
  frozenInput,
  latestDoneRun,
  listRuns,
  runAgain,
  runHeads,
  runPoints,
  runStatus,
  startRun,
} from './runs.server'

let fresh: FreshDatabase
let userId: number
let project: Project
const ids = { base: '', well: '', point: '' }
let count = 0

beforeAll(async () => {
  fresh = await freshDatabase()
  userId = await makePerson(fresh.database, { name: 'R. Oyelaran' })
})
afterAll(() => fresh.close())

async function save(changes: RowChange[]) {
  const answer = await saveRows(fresh.database, {
    projectId: project.id,
    userId,
    changes,
    kinds: { ...groundKinds, ...waterKinds, ...casesKinds },
  })
  if (!answer.ok) throw new Error(JSON.stringify(answer))
  return answer.rows
}
const add = (kind: string, body: object, id: string = randomUUID()): RowChange => ({
  op: 'add',
  kind,
  id,
  body,
})
const m = (value: number) => ({ value, unit: 'm' })
const extent = { xMin: 0, xMax: 1000, yMin: 0, yMax: 600 }

/** A confined strip between two fixed heads: heads fall evenly from west to east. */
async function strip(cellSize = 50, lengthUnit: 'm' | 'ft' = 'm') {
  count += 1
  const id = await makeProject(fresh.database, { number: `P-${count}`, createdBy: userId })
  await fresh.database('projects').where({ id }).update({ length_unit: lengthUnit })
  const found = await findProject(fresh.database, id)
  if (!found) throw new Error('The project was just made.')
  project = found
  const sand = randomUUID()
  ids.base = randomUUID()
  ids.well = randomUUID()
  ids.point = randomUUID()
  const k = { value: 10, unit: 'm/d' }
  await save([add('material', { name: 'Sand', kx: k, ky: k }, sand)])
  await save([
    add('zone', { name: 'Everywhere', materialId: sand, base: m(-10), top: m(0) }),
    add('point', { name: 'P1', x: 500, y: 300 }, ids.point),
    add('point', { name: 'P2', x: 9000, y: 300 }),
    add('boundary', {
      name: 'West',
      kind: 'fixed head',
      line: [
        [0, 0],
        [0, 600],
      ],
      levels: [m(12)],
    }),
    add('boundary', {
      name: 'East',
      kind: 'fixed head',
      line: [
        [1000, 0],
        [1000, 600],
      ],
      levels: [m(10)],
    }),
    add(
      'well',
      { name: 'W1', x: 500, y: 300, kind: 'abstraction', rate: { value: 0, unit: 'm3/d' } },
      ids.well,
    ),
    add(
      'case',
      {
        name: 'Base case',
        isBase: true,
        flow: 'confined',
        extent,
        cellSize: { value: cellSize, unit: lengthUnit },
      },
      ids.base,
    ),
  ])
}

async function started(caseId = ids.base) {
  const answer = await startRun(fresh.database, project, caseId, userId)
  if (!answer.ok) throw new Error(JSON.stringify(answer))
  return answer
}
async function computed(caseId = ids.base) {
  const answer = await started(caseId)
  await jobEnded(answer.jobId)
  const run = await findRun(fresh.database, project.id, answer.runId)
  if (!run) throw new Error('The run was just started.')
  return run
}

describe('A run', () => {
  beforeEach(() => strip())

  it('freezes its case, is computed on a thread, and keeps heads, record and values at named points', async () => {
    const run = await computed()
    expect(run).toMatchObject({ number: 1, state: 'done', converged: true, error: null, by: 'R. Oyelaran' })
    expect(run.result?.input).toBe(`sha256:${run.inputSha256}`)
    expect(run.result?.balance.errorPercent[0]).toBeCloseTo(0, 6)
    expect(run.engine).toBe(run.result?.engine)

    const points = await runPoints(fresh.database, project.id, run.id)
    expect(points).toMatchObject([
      { name: 'P1', pointId: ids.point, head: expect.closeTo(11, 6), why: null },
      { name: 'P2', head: null, why: 'outside the extent of the case' },
    ])

    const bytes = await runHeads(fresh.database, project.id, run.id)
    if (!bytes) throw new Error('A finished run has heads.')
    expect(createHash('sha256').update(bytes).digest('hex')).toBe(run.headsSha256)
    const { grid, heads } = decodeHeads(bytes)
    expect([grid.columns, grid.rows, run.headsFormat]).toEqual([20, 12, 1])
    expect(heads[0]).toBeCloseTo(11.95, 6)
    expect(await findJob(run.jobId ?? 0)).toMatchObject({ state: 'done', error: null })
  })

  it('keeps heads at points in metres when the project is in feet', async () => {
    await strip(200, 'ft')
    const run = await computed()
    expect(run.model.units.length).toBe('ft')
    const [point] = await runPoints(fresh.database, project.id, run.id)
    expect(point?.head).toBeCloseTo(11, 6)
  })

  it('stores the frozen model file in the form whose SHA-256 is the input hash', async () => {
    const run = await computed()
    const input = await frozenInput(fresh.database, project.id, run.id)
    expect(
      createHash('sha256')
        .update(input?.text ?? '')
        .digest('hex'),
    ).toBe(run.inputSha256)
    expect(JSON.parse(input?.text ?? '')).toEqual(run.model)
  })

  it('opens section 5 of the book, and is written into the history', async () => {
    await computed()
    const states = await sectionStates(fresh.database, project.id)
    expect(states.find((section) => section.key === 'heads')?.state).toBe('drafted')
    const actions = (await recentHistory(fresh.database, project.id)).map((line) => line.action)
    expect(actions.slice(0, 2)).toEqual(['computed run', 'started run'])
  })

  it('stays as it was while the book goes on, and is marked once its case has changed', async () => {
    const before = await computed()
    await save([add('case', { name: 'Another case' })])
    expect((await listRuns(fresh.database, project))[0]?.stale).toBe(false)
    const [well] = await fresh.database('book_rows').where({ id: ids.well }).select('version')
    await save([
      {
        op: 'edit',
        kind: 'well',
        id: ids.well,
        version: well.version,
        body: { name: 'W1', x: 500, y: 300, kind: 'abstraction', rate: { value: 300, unit: 'm3/d' } },
      },
    ])
    expect((await listRuns(fresh.database, project))[0]).toMatchObject({
      number: 1,
      stale: true,
      state: 'done',
    })
    expect(await findRun(fresh.database, project.id, before.id)).toEqual(before)

    const after = await computed()
    expect(after.number).toBe(2)
    expect(after.result?.wells[0]?.achieved).toEqual([300])
    expect((await listRuns(fresh.database, project)).map((run) => run.stale)).toEqual([false, true])
    expect((await latestDoneRun(fresh.database, project.id))?.id).toBe(after.id)
  })

  it('of a case that is not ready is refused with what is missing, and leaves no trace', async () => {
    const other = randomUUID()
    await save([add('case', { name: 'Coarse', cellSize: m(0.1) }, other)])
    const answer = await startRun(fresh.database, project, other, userId)
    expect(answer).toMatchObject({ ok: false, reason: 'problems', problems: [{ section: 'cases' }] })
    expect(await listRuns(fresh.database, project)).toEqual([])
  })

  it('belongs to its project: another one finds neither run, nor heads, nor model file', async () => {
    const run = await computed()
    const elsewhere = await makeProject(fresh.database, { number: `Q-${count}`, createdBy: userId })
    expect(await findRun(fresh.database, elsewhere, run.id)).toBeUndefined()
    expect(await runStatus(fresh.database, elsewhere, run.id)).toBeUndefined()
    expect(await runHeads(fresh.database, elsewhere, run.id)).toBeUndefined()
    expect(await frozenInput(fresh.database, elsewhere, run.id)).toBeUndefined()
    expect(await runPoints(fresh.database, elsewhere, run.id)).toEqual([])
    expect(await cancelRun(fresh.database, elsewhere, run.id)).toBe(false)
    expect(await runAgain(fresh.database, elsewhere, run.id, userId)).toBeUndefined()
  })

  it('whose stored heads are damaged says so instead of showing them', async () => {
    const run = await computed()
    await fresh
      .database('runs')
      .where({ id: run.id })
      .update({ heads_sha256: '0'.repeat(64) })
    await expect(runHeads(fresh.database, project.id, run.id)).rejects.toThrow(/damaged/)
  })

  it('that the solver refuses has failed, with the name of the row it is about', async () => {
    const [boundary] = await fresh
      .database('book_rows')
      .where({ project_id: project.id, kind: 'boundary' })
      .whereRaw("json_value(body, '$.name') = 'East'")
    await save([
      {
        op: 'edit',
        kind: 'boundary',
        id: boundary.id,
        version: boundary.version,
        body: {
          name: 'East',
          kind: 'fixed head',
          line: [
            [1000, 0],
            [1800, 600],
          ],
          levels: [m(10)],
        },
      },
    ])
    const run = await computed()
    expect(run.state).toBe('failed')
    expect(run.error).toMatch(/^boundaries, East: /)
    expect(await findJob(run.jobId ?? 0)).toMatchObject({ state: 'failed' })
  })
})

describe('A long run', () => {
  // 600,000 cells: far longer than any of these tests takes.
  beforeEach(() => strip(1))

  it('is started once by a double click, and stops when it is cancelled', async () => {
    const [first, second] = await Promise.all([started(), started()])
    expect(second).toMatchObject({ runId: first.runId, jobId: first.jobId })
    expect([first.alreadyUnderWay, second.alreadyUnderWay].sort()).toEqual([false, true])
    expect(await listRuns(fresh.database, project)).toHaveLength(1)

    let seen = await runStatus(fresh.database, project.id, first.runId)
    while (!seen?.progress?.iterations) {
      await new Promise((resolve) => setTimeout(resolve, 100))
      seen = await runStatus(fresh.database, project.id, first.runId)
    }
    expect(seen).toMatchObject({ state: 'running', number: 1, caseName: 'Base case' })
    expect(seen.progress.residual).toBeGreaterThan(0)

    expect(await cancelRun(fresh.database, project.id, first.runId)).toBe(true)
    await jobEnded(first.jobId)
    expect(await runStatus(fresh.database, project.id, first.runId)).toMatchObject({
      state: 'cancelled',
      error: null,
    })
    expect(await cancelRun(fresh.database, project.id, first.runId)).toBe(false)
    expect(await runHeads(fresh.database, project.id, first.runId)).toBeUndefined()
  })

  it('lets its person have two under way, and not a third', async () => {
    const others = [randomUUID(), randomUUID()]
    await save(others.map((id, i) => add('case', { name: `Case ${i}`, tolerance: 1e-9 / (i + 1) }, id)))
    const first = await started()
    const second = await started(others[0])
    expect(await startRun(fresh.database, project, others[1] ?? '', userId)).toMatchObject({
      ok: false,
      reason: 'too many',
    })
    await cancelRun(fresh.database, project.id, first.runId)
    await cancelRun(fresh.database, project.id, second.runId)
    await Promise.all([jobEnded(first.jobId), jobEnded(second.jobId)])
  })

  it('is marked as interrupted by a restart, and its frozen input can be computed again as a new run', async () => {
    const first = await started()
    // The thread of a server that went away never reports again; here its report comes to a run that has ended.
    await markInterruptedJobs()
    expect(await runStatus(fresh.database, project.id, first.runId)).toMatchObject({ state: 'interrupted' })
    const again = await runAgain(fresh.database, project.id, first.runId, userId)
    if (!again?.ok) throw new Error(JSON.stringify(again))
    expect(again.number).toBe(2)
    const [earlier, later] = await Promise.all(
      [first, again].map(({ runId }) => findRun(fresh.database, project.id, runId)),
    )
    expect(later?.inputSha256).toBe(earlier?.inputSha256)
    expect(await runPoints(fresh.database, project.id, again.runId)).toHaveLength(2)
    for (const { jobId } of [first, again]) {
      await cancelJob(jobId)
      await jobEnded(jobId)
    }
    expect(await runStatus(fresh.database, project.id, first.runId)).toMatchObject({ state: 'interrupted' })
  })
})

describe('A run whose process went away', () => {
  beforeEach(() => strip(200))

  it('can be cancelled, though no thread here knows it', async () => {
    const run = await computed()
    await fresh.database('runs').where({ id: run.id }).update({ state: 'running' })
    await fresh.database('jobs').where({ id: run.jobId }).update({ state: 'running' })
    expect(await cancelRun(fresh.database, project.id, run.id)).toBe(true)
    expect(await runStatus(fresh.database, project.id, run.id)).toMatchObject({ state: 'cancelled' })
    expect(await findJob(run.jobId ?? 0)).toMatchObject({ state: 'cancelled' })
  })
})
