import canonicalize from 'canonicalize'
import { digestOf, recordSection } from '~/book/sections.server'
import { type Finding, freezeCase } from '~/cases/freeze'
import { caseInputs } from '~/cases/inputs.server'
import { modelHash } from '~/cases/model-hash.server'
import { deleteObject, getVerified, putBuffer } from '~/files/files.server'
import { cancelJob, enterJob, launchJob, openJobs } from '~/jobs/jobs.server'
import { recordHistory } from '~/projects/history.server'
import type { Project } from '~/projects/project'
import { decodeHeads } from '~/solver/heads-buffer'
import type { Model } from '~/solver/model'
import type { Result } from '~/solver/result'
import type { SolveMessage } from '~/solver/solve.thread'
import { convert } from '~/units'
import type { Database } from '~database/connection.server'
import { solverKernels } from './kernels.server'
import type { RunLine, RunPoint, RunState, RunStatus, SolveProgress } from './run'

/** A solve that takes longer is stopped. */
export const longestSolveSeconds = 600
/** Solves that a person may have waiting or running at a time. */
export const openSolvesPerPerson = 2

/** What a run's thread sends last. */
export type SolvedMessage = Extract<SolveMessage, { kind: 'done' }>

export type StartAnswer =
  | { ok: true; runId: number; number: number; jobId: number; alreadyUnderWay: boolean }
  | { ok: false; reason: 'problems'; problems: Finding[] }
  | { ok: false; reason: 'too many'; message: string }

/** A run whole: its frozen input and the record that came back. */
export interface Run {
  id: number
  number: number
  projectId: number
  caseId: string
  caseVersion: number
  caseName: string
  jobId: number | null
  state: RunState
  model: Model
  inputSha256: string
  sectionsDigest: string
  engine: string | null
  converged: boolean | null
  result: Result | null
  headsKey: string | null
  headsSha256: string | null
  headsFormat: number | null
  error: string | null
  createdAt: Date
  startedAt: Date | null
  endedAt: Date | null
  by: string
}

interface RunRow {
  id: number
  number: number
  project_id: number
  case_id: string
  case_version: number
  case_name: string
  job_id: number | null
  state: RunState
  input: string
  input_sha256: string
  sections_digest: string
  engine: string | null
  converged: 0 | 1 | null
  result: string | null
  heads_key: string | null
  heads_sha256: string | null
  heads_format: number | null
  error: string | null
  created_at: Date
  started_at: Date | null
  ended_at: Date | null
}

/** What a run is made from: its input can change only with one of these. */
const runSections = ['ground', 'water', 'cases'] as const

const outsideReason = 'outside the extent of the case'

let turn: Promise<unknown> = Promise.resolve()

/**
 * One after another: two clicks at the same moment must see each other's run, and jobs belong to this process anyway.
 * (Row locks on users or projects would deadlock with the foreign keys of every save.)
 */
export function inTurn<T>(work: () => Promise<T>): Promise<T> {
  const next = turn.then(work)
  // The caller gets the failure; the next in turn starts either way.
  turn = next.then(
    () => undefined,
    () => undefined,
  )
  return next
}

const tooMany = {
  ok: false,
  reason: 'too many',
  message: `You have ${openSolvesPerPerson} runs waiting or running already: wait for one, or cancel one.`,
} as const

/**
 * Freezes a case as the book stands and starts computing it; not to be called inside a transaction.
 * The same input of the same case that is still under way is answered with that run, so that a double click starts one.
 */
export async function startRun(
  db: Database,
  project: Project,
  caseId: string,
  userId: number,
): Promise<StartAnswer> {
  return begin(db, async (trx) => {
    const inputs = await caseInputs(trx, project)
    const answer = freezeCase(inputs, caseId)
    if (!answer.ok) return answer.problems
    const own = inputs.cases.find((row) => row.id === caseId)
    if (!own) throw new Error('A case that was frozen must be in the book.')
    const { model, points, outside } = answer.frozen
    return {
      projectId: project.id,
      userId,
      caseId,
      caseVersion: own.version,
      caseName: own.body.name,
      model,
      input: canonicalText(model),
      inputSha256: sha256Of(model),
      sectionsDigest: await digestOf(trx, project.id, runSections),
      points: [
        ...points.map((point) => ({ ...point, why: null })),
        ...outside.map((point) => ({ ...point, why: outsideReason })),
      ],
    }
  })
}

/**
 * Computes the frozen input of an earlier run once more, as a new run: after an interruption, say. Undefined when
 * there is no such run in the project.
 */
export async function runAgain(
  db: Database,
  projectId: number,
  runId: number,
  userId: number,
): Promise<StartAnswer | undefined> {
  const earlier = await db<RunRow>('runs').where({ project_id: projectId, id: runId }).first()
  if (!earlier) return undefined
  return begin(db, async (trx) => {
    const points = await trx('run_points')
      .where({ run_id: earlier.id })
      .select<NewRun['points']>('point_id as rowId', 'name', 'x', 'y', 'why')
    return {
      projectId,
      userId,
      caseId: earlier.case_id,
      caseVersion: earlier.case_version,
      caseName: earlier.case_name,
      model: JSON.parse(earlier.input) as Model,
      input: earlier.input,
      inputSha256: earlier.input_sha256,
      sectionsDigest: earlier.sections_digest,
      points: points.map((point) => ({ ...point, why: point.why === outsideReason ? outsideReason : null })),
    }
  })
}

async function begin(
  db: Database,
  prepare: (trx: Database) => Promise<NewRun | Finding[]>,
): Promise<StartAnswer> {
  return inTurn(async () => {
    const { answer, run } = await db.transaction(async (trx) => {
      const prepared = await prepare(trx)
      if (Array.isArray(prepared)) {
        const refused: StartAnswer = { ok: false, reason: 'problems', problems: prepared }
        return { answer: refused, run: null }
      }
      return { answer: await enterRun(trx, prepared), run: prepared }
    })
    if (run && answer.ok && !answer.alreadyUnderWay) launch(db, run, answer)
    return answer
  })
}

/** RFC 8785: the very text whose SHA-256 is the input hash, so that a downloaded model file proves itself. */
function canonicalText(model: Model): string {
  const text = canonicalize(model)
  if (text === undefined) throw new TypeError('A model that is not JSON cannot be frozen.')
  return text
}

function sha256Of(model: Model): string {
  return modelHash(model).slice('sha256:'.length)
}

interface NewRun {
  projectId: number
  userId: number
  caseId: string
  caseVersion: number
  caseName: string
  model: Model
  input: string
  inputSha256: string
  sectionsDigest: string
  /** `why` is filled for a point that the model leaves out. */
  points: { rowId: string; name: string; x: number; y: number; why: string | null }[]
}

async function enterRun(trx: Database, run: NewRun): Promise<StartAnswer> {
  const same = await trx('runs')
    .where({ project_id: run.projectId, case_id: run.caseId, input_sha256: run.inputSha256 })
    .whereIn('state', ['queued', 'running'])
    .first<{ id: number; number: number; job_id: number } | undefined>('id', 'number', 'job_id')
  if (same)
    return { ok: true, runId: same.id, number: same.number, jobId: same.job_id, alreadyUnderWay: true }
  if ((await openJobs(trx, run.userId, 'solve')) >= openSolvesPerPerson) return tooMany

  const [last] = await trx('runs').where({ project_id: run.projectId }).max('number as number')
  const number = Number(last?.number ?? 0) + 1
  const jobId = await enterJob(trx, { projectId: run.projectId, userId: run.userId, kind: 'solve' })
  const [runId] = await trx('runs').insert({
    project_id: run.projectId,
    number,
    case_id: run.caseId,
    case_version: run.caseVersion,
    case_name: run.caseName,
    job_id: jobId,
    state: 'queued',
    input: run.input,
    input_sha256: run.inputSha256,
    sections_digest: run.sectionsDigest,
    created_at: new Date(),
    created_by: run.userId,
  })
  if (runId === undefined) throw new Error('The database returned no run id.')
  if (run.points.length > 0) {
    await trx('run_points').insert(
      run.points.map(({ rowId, name, x, y, why }) => ({
        run_id: runId,
        point_id: rowId,
        name,
        x,
        y,
        head: null,
        why: why ?? 'not computed yet',
      })),
    )
  }
  await recordHistory(trx, {
    projectId: run.projectId,
    userId: run.userId,
    section: 'heads',
    action: 'started run',
    subject: `Run ${number}, ${run.caseName}`,
    after: { input: run.inputSha256 },
  })
  return { ok: true, runId, number, jobId, alreadyUnderWay: false }
}

function launch(
  db: Database,
  run: NewRun,
  { runId, number, jobId }: { runId: number; number: number; jobId: number },
) {
  launchJob<SolvedMessage>(jobId, {
    projectId: run.projectId,
    userId: run.userId,
    kind: 'solve',
    workerData: { model: run.model, input: `sha256:${run.inputSha256}`, kernels: solverKernels() },
    limitSeconds: longestSolveSeconds,
    onStart: async () => {
      await db('runs')
        .where({ id: runId, state: 'queued' })
        .update({ state: 'running', started_at: new Date() })
    },
    onDone: (message) => storeResult(db, run, { runId, number }, message),
    onEnd: async (state, error, _jobId, path) => {
      const said = error && path ? `${placeInModel(run.model, path)}: ${error}` : error
      await db.transaction(async (trx) => {
        const changed = await trx('runs')
          .where({ id: runId })
          .whereIn('state', ['queued', 'running'])
          .update({ state, error: said?.slice(0, 2000) ?? null, ended_at: new Date() })
        if (changed === 0) return
        await recordHistory(trx, {
          projectId: run.projectId,
          userId: run.userId,
          section: 'heads',
          action: state === 'cancelled' ? 'cancelled run' : 'run failed',
          subject: `Run ${number}, ${run.caseName}`,
          reason: said?.slice(0, 500),
        })
      })
    },
  })
}

/** Stores what the thread computed: the head field in S3, the record and the (last) heads at points here. */
async function storeResult(
  db: Database,
  run: NewRun,
  { runId, number }: { runId: number; number: number },
  { result, buffer }: SolvedMessage,
): Promise<void> {
  const format = headsFormat(buffer)
  const stored = await putBuffer(new Uint8Array(buffer), {
    folder: `projects/${run.projectId}/heads`,
    contentType: 'application/octet-stream',
  })
  try {
    await db.transaction(async (trx) => {
      const changed = await trx('runs')
        .where({ id: runId })
        .whereIn('state', ['queued', 'running'])
        .update({
          state: 'done',
          engine: result.engine,
          converged: result.converged,
          result: JSON.stringify(result),
          heads_key: stored.key,
          heads_sha256: stored.sha256,
          heads_format: format,
          ended_at: new Date(),
        })
      if (changed === 0) throw new Error(`Run ${number} had ended already.`)
      await storePoints(trx, runId, run, result)
      await recordHeads(trx, run.projectId, run.userId)
      await recordHistory(trx, {
        projectId: run.projectId,
        userId: run.userId,
        section: 'heads',
        action: 'computed run',
        subject: `Run ${number}, ${run.caseName}`,
        after: {
          input: run.inputSha256,
          heads: stored.sha256,
          engine: result.engine,
          converged: result.converged,
        },
      })
    })
  } catch (error) {
    await deleteObject(stored.key)
    throw error
  }
}

/** Records what section 5 holds: its finished runs, and what was accepted of them. In the transaction of the change. */
export async function recordHeads(trx: Database, projectId: number, userId: number): Promise<void> {
  const runs = await trx('runs')
    .where({ project_id: projectId, state: 'done' })
    .orderBy('id')
    .select('id', 'input_sha256', 'heads_sha256')
  const acceptances = await trx('warning_acceptances')
    .join('runs', 'runs.id', 'warning_acceptances.run_id')
    .where({ project_id: projectId })
    .orderBy('warning_acceptances.id')
    .pluck('warning_acceptances.id')
  const content = acceptances.length > 0 ? { runs, acceptances } : { runs }
  await recordSection(trx, projectId, 'heads', content, userId)
}

/** Version of a head field that arrived whole; throws RangeError when it did not. */
function headsFormat(buffer: ArrayBuffer): number {
  decodeHeads(buffer)
  return new DataView(buffer).getUint32(8, true)
}

async function storePoints(trx: Database, runId: number, run: NewRun, result: Result): Promise<void> {
  const heads = new Map(result.points.map((point) => [point.name, point]))
  const rows = run.points
    .filter((point) => point.why === null)
    .map(({ rowId, name, x, y }) => {
      const point = heads.get(name)
      const head = point?.head.at(-1) ?? null
      return {
        run_id: runId,
        point_id: rowId,
        name,
        x,
        y,
        head: head === null ? null : convert({ value: head, unit: run.model.units.length }, 'm'),
        why: head === null ? (point?.why ?? 'no head here') : null,
      }
    })
  if (rows.length > 0)
    await trx('run_points').insert(rows).onConflict(['run_id', 'point_id']).merge(['head', 'why'])
}

/** Says "boundaries: West" for "boundaries[0].line": the name in the book rather than a place in a file. */
function placeInModel(model: Model, path: string): string {
  const [, list, index] = path.match(/^(\w+)\[(\d+)\]/) ?? []
  const rows = list ? (model as unknown as Record<string, unknown>)[list] : undefined
  const row: unknown = Array.isArray(rows) ? rows[Number(index)] : undefined
  const name = row && typeof row === 'object' && 'name' in row ? row.name : undefined
  return typeof name === 'string' ? `${list}, ${name}` : path
}

/** Stops a run that waits or computes. False when the project has no such run under way. */
export async function cancelRun(db: Database, projectId: number, runId: number): Promise<boolean> {
  const run = await db('runs')
    .where({ project_id: projectId, id: runId })
    .whereIn('state', ['queued', 'running'])
    .first<{ job_id: number } | undefined>('job_id')
  if (!run) return false
  if (!(await cancelJob(run.job_id))) {
    await db('runs')
      .where({ project_id: projectId, id: runId })
      .whereIn('state', ['queued', 'running'])
      .update({ state: 'cancelled', ended_at: new Date() })
  }
  return true
}

/** Every run of the project, newest first. */
export async function listRuns(db: Database, project: Project): Promise<RunLine[]> {
  const rows = await db('runs')
    .join('users', 'users.id', 'runs.created_by')
    .where({ project_id: project.id })
    .orderBy('number', 'desc')
    .select<(Omit<RunRow, 'input' | 'result'> & { by: string; error_percent: number | null })[]>(
      'runs.id',
      'number',
      'case_id',
      'case_name',
      'state',
      'converged',
      'input_sha256',
      'sections_digest',
      'engine',
      'error',
      'runs.created_at',
      'ended_at',
      'users.name as by',
      db.raw("json_value(result, '$.balance.errorPercent[last]') as error_percent"),
    )
  const stale = await staleRuns(
    db,
    project,
    rows.map((row) => ({
      id: row.id,
      caseId: row.case_id,
      inputSha256: row.input_sha256,
      sectionsDigest: row.sections_digest,
    })),
  )
  return rows.map((row) => ({
    id: row.id,
    number: row.number,
    caseId: row.case_id,
    caseName: row.case_name,
    state: row.state,
    converged: row.converged === null ? null : row.converged === 1,
    errorPercent: row.error_percent === null ? null : Number(row.error_percent),
    inputSha256: row.input_sha256,
    engine: row.engine,
    error: row.error,
    createdAt: row.created_at.toISOString(),
    endedAt: row.ended_at?.toISOString() ?? null,
    by: row.by,
    stale: stale.has(row.id),
  }))
}

/**
 * The runs that the book has moved away from: their case, frozen now, would have another input (or none). A change
 * that does not reach a case, such as a new case beside it, leaves its runs current.
 */
async function staleRuns(
  db: Database,
  project: Project,
  runs: readonly Pick<Run, 'id' | 'caseId' | 'inputSha256' | 'sectionsDigest'>[],
): Promise<Set<number>> {
  const digest = await digestOf(db, project.id, runSections)
  const moved = runs.filter((run) => run.sectionsDigest !== digest)
  if (moved.length === 0) return new Set()
  const inputs = await caseInputs(db, project)
  const hashes = new Map<string, string | null>()
  for (const caseId of new Set(moved.map((run) => run.caseId))) {
    const answer = freezeCase(inputs, caseId)
    hashes.set(caseId, answer.ok ? sha256Of(answer.frozen.model) : null)
  }
  return new Set(moved.filter((run) => hashes.get(run.caseId) !== run.inputSha256).map((run) => run.id))
}

/** True when the book has moved away from the run. */
export async function isStale(
  db: Database,
  project: Project,
  run: Pick<Run, 'id' | 'caseId' | 'inputSha256' | 'sectionsDigest'>,
): Promise<boolean> {
  return (await staleRuns(db, project, [run])).has(run.id)
}

/** A run of this project whole, or undefined. */
export async function findRun(db: Database, projectId: number, runId: number): Promise<Run | undefined> {
  const row = await db('runs')
    .join('users', 'users.id', 'runs.created_by')
    .where({ project_id: projectId, 'runs.id': runId })
    .first<(RunRow & { by: string }) | undefined>('runs.*', 'users.name as by')
  return (
    row && {
      id: row.id,
      number: row.number,
      projectId: row.project_id,
      caseId: row.case_id,
      caseVersion: row.case_version,
      caseName: row.case_name,
      jobId: row.job_id,
      state: row.state,
      model: JSON.parse(row.input) as Model,
      inputSha256: row.input_sha256,
      sectionsDigest: row.sections_digest,
      engine: row.engine,
      converged: row.converged === null ? null : row.converged === 1,
      result: row.result === null ? null : (JSON.parse(row.result) as Result),
      headsKey: row.heads_key,
      headsSha256: row.heads_sha256,
      headsFormat: row.heads_format,
      error: row.error,
      createdAt: row.created_at,
      startedAt: row.started_at,
      endedAt: row.ended_at,
      by: row.by,
    }
  )
}

/** The frozen model file of a run as it is stored, with its number and hash; undefined when there is no such run. */
export async function frozenInput(
  db: Database,
  projectId: number,
  runId: number,
): Promise<{ number: number; caseName: string; text: string; sha256: string } | undefined> {
  const row = await db<RunRow>('runs').where({ project_id: projectId, id: runId }).first()
  return row && { number: row.number, caseName: row.case_name, text: row.input, sha256: row.input_sha256 }
}

/** The newest finished run of the project, or of one of its cases; undefined when there is none. */
export async function latestDoneRun(
  db: Database,
  projectId: number,
  caseId?: string,
): Promise<Run | undefined> {
  const query = db('runs').where({ project_id: projectId, state: 'done' }).orderBy('id', 'desc')
  if (caseId) query.where({ case_id: caseId })
  const row = await query.first<{ id: number } | undefined>('id')
  return row && findRun(db, projectId, row.id)
}

/** How a run stands and how far it is; undefined when the project has no such run. */
export async function runStatus(
  db: Database,
  projectId: number,
  runId: number,
): Promise<RunStatus | undefined> {
  const row = await db('runs')
    .leftJoin('jobs', 'jobs.id', 'runs.job_id')
    .where({ 'runs.project_id': projectId, 'runs.id': runId })
    .first<
      | (Pick<RunRow, 'id' | 'number' | 'case_name' | 'state' | 'converged' | 'error'> & {
          progress: unknown
        })
      | undefined
    >('runs.id', 'number', 'case_name', 'runs.state', 'converged', 'runs.error', 'jobs.progress')
  if (!row) return undefined
  const progress = typeof row.progress === 'string' ? JSON.parse(row.progress) : row.progress
  return {
    id: row.id,
    number: row.number,
    caseName: row.case_name,
    state: row.state,
    converged: row.converged === null ? null : row.converged === 1,
    progress: (progress as SolveProgress | null) ?? null,
    error: row.error,
  }
}

/**
 * The head field of a finished run, held against its SHA-256 on record; undefined when the project has no such run
 * or it has no heads. Throws when the stored field is damaged.
 */
export async function runHeads(db: Database, projectId: number, runId: number): Promise<Buffer | undefined> {
  const row = await db<RunRow>('runs').where({ project_id: projectId, id: runId, state: 'done' }).first()
  if (!row?.heads_key || !row.heads_sha256) return undefined
  return getVerified(row.heads_key, row.heads_sha256)
}

/** Heads at the named points of a run, by name: P2 before P10. */
export async function runPoints(db: Database, projectId: number, runId: number): Promise<RunPoint[]> {
  const points: RunPoint[] = await db('run_points')
    .join('runs', 'runs.id', 'run_points.run_id')
    .where({ 'runs.project_id': projectId, 'runs.id': runId })
    .select('point_id as pointId', 'name', 'x', 'y', 'head', 'why')
  return points.sort((a, b) => a.name.localeCompare(b.name, 'en', { numeric: true }))
}
