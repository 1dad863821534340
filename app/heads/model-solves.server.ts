import { mostCells } from '~/cases/case'
import { modelHash } from '~/cases/model-hash.server'
import { deleteObject, getVerified, putBuffer } from '~/files/files.server'
import { findJob, type Job, openJobs, startJob } from '~/jobs/jobs.server'
import type { Model } from '~/solver/model'
import type { Result } from '~/solver/result'
import type { Database } from '~database/connection.server'
import { solverKernels } from './kernels.server'
import { inTurn, longestSolveSeconds, openSolvesPerPerson, type SolvedMessage } from './runs.server'

/** A model file that came by itself, outside any project, and what became of it. */
export interface ModelSolve {
  job: number
  state: Job['state']
  /** While it runs: how far it is. */
  progress: unknown
  result: Result | null
  /** Why there is no result: where in the model file, if anywhere, and what. */
  error: { path: string | null; message: string } | null
}

/** Results are kept this long; they belong to nothing else and can be computed again. */
const keptHours = 24

interface Outcome {
  resultKey?: string
  resultSha256?: string
  path?: string | null
}

/** Starts solving a model file that was checked already. Undefined when the person has too many under way. */
export async function startModelSolve(
  db: Database,
  userId: number,
  model: Model,
): Promise<number | undefined> {
  return inTurn(async () => {
    if ((await openJobs(db, userId, 'solve')) >= openSolvesPerPerson) return undefined
    return startJob<SolvedMessage>({
      projectId: null,
      userId,
      kind: 'solve',
      workerData: { model, input: modelHash(model), mostCells, kernels: solverKernels() },
      limitSeconds: longestSolveSeconds,
      onDone: async ({ result }, jobId) => {
        const stored = await putBuffer(Buffer.from(JSON.stringify(result)), {
          folder: `api/${userId}`,
          contentType: 'application/json',
        })
        await keepOutcome(db, jobId, { resultKey: stored.key, resultSha256: stored.sha256 })
      },
      onEnd: (_state, _error, jobId, path) => keepOutcome(db, jobId, { path }),
    })
  })
}

async function keepOutcome(db: Database, jobId: number, outcome: Outcome): Promise<void> {
  await db('jobs')
    .where({ id: jobId })
    .update({ progress: JSON.stringify(outcome) })
}

/** The solve as its owner may see it; undefined for anybody else and for jobs of another kind. */
export async function findModelSolve(userId: number, jobId: number): Promise<ModelSolve | undefined> {
  const job = await findJob(jobId)
  if (!job || job.user_id !== userId || job.kind !== 'solve' || job.project_id !== null) return undefined
  const open = job.state === 'queued' || job.state === 'running'
  const outcome = open ? {} : ((job.progress ?? {}) as Outcome)
  const { resultKey, resultSha256 } = outcome
  const result =
    resultKey && resultSha256
      ? (JSON.parse((await getVerified(resultKey, resultSha256)).toString('utf8')) as Result)
      : null
  return {
    job: job.id,
    state: job.state,
    progress: open ? job.progress : null,
    result,
    error: open || result ? null : { path: outcome.path ?? null, message: endMessage(job) },
  }
}

function endMessage(job: Job): string {
  if (job.error) return job.error
  if (job.state === 'cancelled') return 'It was cancelled.'
  if (job.state === 'interrupted') return 'It was interrupted by a restart of the server: send it again.'
  return `Its result was kept for ${keptHours} hours and is gone: send it again.`
}

/** Removes results that are older than they are kept for. */
export async function forgetOldModelSolves(db: Database, now = new Date()): Promise<void> {
  const old = await db<Job>('jobs')
    .where({ kind: 'solve', state: 'done' })
    .whereNull('project_id')
    .whereNotNull('progress')
    .where('ended_at', '<', new Date(now.getTime() - keptHours * 3_600_000))
  for (const job of old) {
    const { resultKey } = (
      typeof job.progress === 'string' ? JSON.parse(job.progress) : job.progress
    ) as Outcome
    if (resultKey) await deleteObject(resultKey)
    await db('jobs').where({ id: job.id }).update({ progress: null })
  }
}
