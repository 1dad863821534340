import { existsSync } from 'node:fs'
import { join } from 'node:path'
import { pathToFileURL } from 'node:url'
import { Worker } from 'node:worker_threads'
import { type Database, database } from '~database/connection.server'

export type JobKind = 'solve' | 'import' | 'draw'
export type JobState = 'queued' | 'running' | 'done' | 'failed' | 'cancelled' | 'interrupted'

export interface Job {
  id: number
  project_id: number | null
  user_id: number
  kind: JobKind
  state: JobState
  progress: unknown
  error: string | null
  created_at: Date
  started_at: Date | null
  ended_at: Date | null
}

/** Where each thread's source lies; production runs the bundle of the same name in build/threads. */
const sources: Record<JobKind, string> = {
  solve: 'app/solver/solve.thread.ts',
  import: 'app/readings/import.thread.ts',
  draw: 'app/packages/draw.thread.ts',
}

function startThread(kind: JobKind, workerData: unknown): Worker {
  const built = join(process.cwd(), 'build/threads', `${kind}.js`)
  if (process.env.NODE_ENV === 'production' && existsSync(built)) return new Worker(built, { workerData })
  // A thread of Node 20 does not take over `--import tsx`: it registers tsx itself, then loads the source.
  const source = JSON.stringify(pathToFileURL(join(process.cwd(), sources[kind])).href)
  const code = `import('tsx/esm/api').then(({ register }) => { register(); return import(${source}) })`
  return new Worker(code, { eval: true, workerData })
}

export interface JobRequest<Done> {
  projectId: number | null
  userId: number
  kind: JobKind
  /** Passed to the thread; `cancel` (an Int32Array over shared memory) is added: not 0 means stop. */
  workerData: Record<string, unknown>
  /** The job is stopped, and has failed, when it takes longer. */
  limitSeconds?: number
  /** Called with the thread's last message ({ kind: 'done', … }); what it stores is part of the job. */
  onDone: (message: Done, jobId: number) => Promise<void>
  /** Called when the job ends in any other way; `path` says where in its input a refusal points. */
  onEnd?: (
    state: 'failed' | 'cancelled',
    error: string | null,
    jobId: number,
    path: string | null,
  ) => Promise<void>
  onStart?: (jobId: number) => Promise<void>
}

interface Waiting {
  jobId: number
  request: JobRequest<never>
}

interface Running {
  kind: JobKind
  worker: Worker
  cancel: Int32Array
}

// Two cores serve two solves; one thread more, so that an import or a drawing never waits behind two long solves.
const atOnce = 3
const solvesAtOnce = 2
/** A thread that does not look at its cancel flag within this time is ended. */
const patienceSeconds = 10

const waiting: Waiting[] = []
const running = new Map<number, Running>()
const ending = new Map<number, Promise<void>>()

/** Enters the record of a job, in the caller's transaction; `launchJob` starts it once that is committed. */
export async function enterJob(
  db: Database,
  job: { projectId: number | null; userId: number; kind: JobKind },
): Promise<number> {
  const [jobId] = await db('jobs').insert({
    project_id: job.projectId,
    user_id: job.userId,
    kind: job.kind,
    state: 'queued',
    created_at: new Date(),
  })
  if (jobId === undefined) throw new Error('The database returned no job id.')
  return jobId
}

/** Puts an entered job in line; it starts when a thread is free. */
export function launchJob<Done>(jobId: number, request: JobRequest<Done>): void {
  waiting.push({ jobId, request: request as JobRequest<never> })
  startWaiting()
}

/** Enters a job and starts it when a thread is free. Returns its id at once. */
export async function startJob<Done>(request: JobRequest<Done>): Promise<number> {
  const jobId = await enterJob(database(), request)
  launchJob(jobId, request)
  return jobId
}

function mayStart({ request }: Waiting): boolean {
  if (running.size >= atOnce) return false
  const solves = [...running.values()].filter((entry) => entry.kind === 'solve').length
  return request.kind !== 'solve' || solves < solvesAtOnce
}

function startWaiting(): void {
  for (;;) {
    const index = waiting.findIndex(mayStart)
    const next = index < 0 ? undefined : waiting.splice(index, 1)[0]
    if (!next) return
    const cancel = new Int32Array(new SharedArrayBuffer(4))
    const worker = startThread(next.request.kind, { ...next.request.workerData, cancel, jobId: next.jobId })
    running.set(next.jobId, { kind: next.request.kind, worker, cancel })
    const end = follow(next, worker, cancel).catch((error: unknown) =>
      console.error(`Job ${next.jobId}:`, error),
    )
    ending.set(next.jobId, end)
    void end.then(() => ending.delete(next.jobId))
  }
}

type Message =
  | { kind: 'progress' }
  | { kind: 'done' }
  | { kind: 'refused'; message: string; path?: string }
  | { kind: 'cancelled' }

/** Writes the latest progress only: a fast thread must not queue up writes of numbers long overtaken. */
function progressWriter(jobId: number): { write: (progress: unknown) => void; settled: () => Promise<void> } {
  let latest: string | null = null
  let writing: Promise<void> | null = null
  async function writeLatest() {
    while (latest !== null) {
      const progress = latest
      latest = null
      await database()('jobs').where({ id: jobId, state: 'running' }).update({ progress })
    }
  }
  return {
    write(progress) {
      latest = JSON.stringify(progress)
      writing ??= writeLatest()
        .catch((error: unknown) => console.error(`Job ${jobId} progress:`, error))
        .finally(() => {
          writing = null
        })
    },
    async settled() {
      await writing
    },
  }
}

async function follow({ jobId, request }: Waiting, worker: Worker, cancel: Int32Array): Promise<void> {
  const db = database()
  const progress = progressWriter(jobId)
  const outcome = new Promise<{ message: Message } | { error: Error }>((resolve) => {
    worker.on('message', (message: Message) => {
      if (message.kind === 'progress') {
        const { kind: _, ...latest } = message
        progress.write(latest)
      } else resolve({ message })
    })
    worker.on('error', (error) =>
      resolve({ error: error instanceof Error ? error : new Error(String(error)) }),
    )
    worker.on('exit', () =>
      resolve(
        Atomics.load(cancel, 0) === 0
          ? { error: new Error('The thread ended before it had an answer.') }
          : { message: { kind: 'cancelled' } },
      ),
    )
  })
  let overTime = false
  const limit = setTimeout(
    () => {
      overTime = true
      stop(worker, cancel)
    },
    (request.limitSeconds ?? 3600) * 1000,
  )
  let state: 'done' | 'failed' | 'cancelled' = 'failed'
  let error: string | null = null
  let path: string | null = null
  try {
    await db('jobs').where({ id: jobId }).update({ state: 'running', started_at: new Date() })
    await request.onStart?.(jobId)
    const ended = await outcome
    clearTimeout(limit)
    await progress.settled()
    if ('error' in ended) error = ended.error.message
    else if (ended.message.kind === 'cancelled') {
      if (overTime) error = `Stopped after ${request.limitSeconds} seconds, the longest that is allowed.`
      else state = 'cancelled'
    } else if (ended.message.kind === 'refused') {
      error = ended.message.message
      path = ended.message.path ?? null
    } else {
      await request.onDone(ended.message as never, jobId)
      state = 'done'
    }
  } catch (caught) {
    error = caught instanceof Error ? caught.message : String(caught)
    console.error(`Job ${jobId} (${request.kind}) failed:`, caught)
  } finally {
    clearTimeout(limit)
    running.delete(jobId)
    void worker.terminate()
    startWaiting()
  }
  if (state !== 'done') await request.onEnd?.(state, error, jobId, path)
  await db('jobs')
    .where({ id: jobId })
    .update({ state, error: error?.slice(0, 2000) ?? null, ended_at: new Date() })
}

function stop(worker: Worker, cancel: Int32Array): void {
  Atomics.store(cancel, 0, 1)
  const end = setTimeout(() => void worker.terminate(), patienceSeconds * 1000)
  worker.on('exit', () => clearTimeout(end))
}

/**
 * Asks a job to stop: at once when it is still waiting, else as soon as its thread looks. False when no thread of this
 * process has it (it went away with an earlier one): then its record is closed, and nothing will call `onEnd`.
 */
export async function cancelJob(jobId: number): Promise<boolean> {
  const active = running.get(jobId)
  if (active) {
    stop(active.worker, active.cancel)
    return true
  }
  if (ending.has(jobId)) return true
  const index = waiting.findIndex((entry) => entry.jobId === jobId)
  const [entry] = index >= 0 ? waiting.splice(index, 1) : []
  await entry?.request.onEnd?.('cancelled', null, jobId, null)
  await database()('jobs')
    .where({ id: jobId })
    .whereIn('state', ['queued', 'running'])
    .update({ state: 'cancelled', ended_at: new Date() })
  return entry !== undefined
}

/** Resolves when the job has ended; for tests and for answers that wait a while. */
export async function jobEnded(jobId: number): Promise<void> {
  await ending.get(jobId)
  while (waiting.some((entry) => entry.jobId === jobId))
    await new Promise((resolve) => setTimeout(resolve, 50))
  await ending.get(jobId)
}

export async function findJob(jobId: number): Promise<Job | undefined> {
  const job = await database()<Job>('jobs').where({ id: jobId }).first()
  if (!job) return undefined
  return { ...job, progress: typeof job.progress === 'string' ? JSON.parse(job.progress) : job.progress }
}

/** How many jobs of a kind a person has waiting or running. */
export async function openJobs(db: Database, userId: number, kind: JobKind): Promise<number> {
  const [row] = await db('jobs')
    .where({ user_id: userId, kind })
    .whereIn('state', ['queued', 'running'])
    .count('* as open')
  return Number(row?.open ?? 0)
}

/** After a restart: whatever was under way is marked, so that a page can offer it again. */
export async function markInterruptedJobs(): Promise<void> {
  const db = database()
  const now = new Date()
  await db('jobs').whereIn('state', ['queued', 'running']).update({ state: 'interrupted', ended_at: now })
  await db('runs').whereIn('state', ['queued', 'running']).update({ state: 'interrupted', ended_at: now })
  await db('imports').where({ state: 'previewing' }).update({ state: 'uploaded' })
  await db('imports').where({ state: 'committing' }).update({ state: 'previewed' })
}
