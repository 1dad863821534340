import { digestOf, recordSection } from '~/book/sections.server'
import { type Finding, freezeCase } from '~/cases/freeze'
import { caseInputs } from '~/cases/inputs.server'
import { inputHash } from '~/cases/model-hash.server'
import { deleteObject, getVerified, putBuffer } from '~/files/files.server'
import { cancelJob, enterJob, launchJob, openJobs } from '~/jobs/jobs.server'
import { recordHistory } from '~/projects/history.server'
import type { Project } from '~/projects/project'
import type { Model } from '~/solver/model'
import type { Result } from '~/solver/result'
import { convert } from '~/units'
import type { Database } from '~database/connection.server'
import type { RunLine, RunPoint, RunState, RunStatus, SolveProgress } from './run'

/** A solve that takes longer is stopped. */
export const longestSolveSeconds = 600
/** Solves that a person may have waiting or running at a time. */
export const openSolvesPerPerson = 2

/** What a run's thread sends last. */
export interface SolvedMessage {
  kind: 'done'
  result: Result
  /** Head field, in the versioned form that app/solver describes. */
  buffer: ArrayBuffer
}

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
  return inTurn(async () => {
    const entered = await db.transaction(async (trx) => {
      const inputs = await caseInputs(trx, project)
      const answer = freezeCase(inputs, caseId)
      if (!answer.ok) return { ok: false, reason: 'problems', problems: answer.problems } as const
      const own = inputs.cases.find((row) => row.id === caseId)
      if (!own) throw new Error('A case that was frozen must be in the book.')
      const { model, points, outside } = answer.frozen
      return enterRun(trx, {
        projectId: project.id,
        userId,
        caseId,
        caseVersion: own.version,
        caseName: own.body.name,
        model,
        input: JSON.stringify(model),
        inputSha256: inputHash(model),
        sectionsDigest: await digestOf(trx, project.id, ['ground', 'water', 'cases']),
        points: [
          ...points.map((point) => ({ ...point, why: null })),
          ...outside.map((point) => ({ ...point, why: outsideReason })),
        ],
      })
    })
    if (entered.ok && !entered.alreadyUnderWay) launch(db, project.id, userId, entered)
    return entered
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
  const earlier = await findRunRow(db, projectId, runId)
  if (!earlier) return undefined
  return inTurn(async () => {
    const entered = await db.transaction(async (trx) => {
      const points = await trx('run_points')
        .where({ run_id: earlier.id })
        .select('point_id as rowId', 'name', 'x', 'y', 'why')
      return enterRun(trx, {
        projectId,
        userId,
        caseId: earlier.case_id,
        caseVersion: earlier.case_version,
        caseName: earlier.case_name,
        model: JSON.parse(earlier.input) as Model,
        input: earlier.input,
        inputSha256: earlier.input_sha256,
        sectionsDigest: earlier.sections_digest,
        points: points.map((point) => ({ ...point, why: point.why === outsideReason ? point.why : null })),
      })
    })
    if (entered.ok && !entered.alreadyUnderWay) launch(db, projectId, userId, entered)
    return entered
  })
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

type Entered =
  | { ok: true; runId: number; number: number; jobId: number; alreadyUnderWay: boolean; run?: NewRun }
  | typeof tooMany

async function enterRun(trx: Database, run: NewRun): Promise<Entered> {
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
  return { ok: true, runId, number, jobId, alreadyUnderWay: false, run }
}
