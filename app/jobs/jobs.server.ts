import { existsSync } from 'node:fs'
import { join } from 'node:path'
import { Worker } from 'node:worker_threads'
import { database } from '~database/connection.server'

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
  return new Worker(join(process.cwd(), sources[kind]), { workerData, execArgv: ['--import', 'tsx'] })
}

export interface JobRequest<Done> {
  projectId: number | null
  userId: number
  kind: JobKind
  /** Passed to the thread; `cancel` (an Int32Array over shared memory) is added: not 0 means stop. */
  workerData: Record<string, unknown>
  /** Called with the thread's last message ({ kind: 'done', … }); what it stores is part of the job. */
  onDone: (message: Done, jobId: number) => Promise<void>
  /** Called when the job ends in any other way. */
  onEnd?: (state: 'failed' | 'cancelled', error: string | null, jobId: number) => Promise<void>
  onStart?: (jobId: number) => Promise<void>
}

interface Waiting {
  jobId: number
  request: JobRequest<never>
}

interface Running {
  worker: Worker
  cancel: Int32Array
}

// One thread of each kind at a time would starve short solves behind long ones, two cores serve two threads.
const atOnce = 2
const waiting: Waiting[] = []
const running = new Map<number, Running>()
const ending = new Map<number, Promise<void>>()

/** Enters a job and starts it when a thread is free. Returns its id at once. */
export async function startJob<Done>(request: JobRequest<Done>): Promise<number> {
  const [jobId] = await database()('jobs').insert({
    project_id: request.projectId,
    user_id: request.userId,
    kind: request.kind,
    state: 'queued',
    created_at: new Date(),
  })
  if (jobId === undefined) throw new Error('The database returned no job id.')
  waiting.push({ jobId, request: request as JobRequest<never> })
  startWaiting()
  return jobId
}

function startWaiting(): void {
  while (running.size < atOnce) {
    const next = waiting.shift()
    if (!next) return
    const cancel = new Int32Array(new SharedArrayBuffer(4))
    const worker = startThread(next.request.kind, { ...next.request.workerData, cancel, jobId: next.jobId })
    running.set(next.jobId, { worker, cancel })
    const end = follow(next, worker).catch((error: unknown) => console.error(`Job ${next.jobId}:`, error))
    ending.set(next.jobId, end)
    void end.then(() => ending.delete(next.jobId))
  }
}

type Message =
  | { kind: 'progress' }
  | { kind: 'done' }
  | { kind: 'refused'; message: string }
  | { kind: 'cancelled' }

async function follow({ jobId, request }: Waiting, worker: Worker): Promise<void> {
  const db = database()
  const outcome = new Promise<{ message: Message } | { error: Error }>((resolve) => {
    let writing = Promise.resolve()
    worker.on('message', (message: Message) => {
      if (message.kind === 'progress') {
        const { kind: _, ...progress } = message
        writing = writing
          .then(async () => {
            await db('jobs')
              .where({ id: jobId, state: 'running' })
              .update({ progress: JSON.stringify(progress) })
          })
          .catch((error: unknown) => console.error(`Job ${jobId} progress:`, error))
      } else resolve({ message })
    })
    worker.on('error', (error) =>
      resolve({ error: error instanceof Error ? error : new Error(String(error)) }),
    )
    worker.on('exit', () => resolve({ error: new Error('The thread ended before it had an answer.') }))
  })
  let state: 'done' | 'failed' | 'cancelled' = 'failed'
  let error: string | null = null
  try {
    await db('jobs').where({ id: jobId }).update({ state: 'running', started_at: new Date() })
    await request.onStart?.(jobId)
    const ended = await outcome
    if ('error' in ended) error = ended.error.message
    else if (ended.message.kind === 'cancelled') state = 'cancelled'
    else if (ended.message.kind === 'refused') error = ended.message.message
    else {
      await request.onDone(ended.message as never, jobId)
      state = 'done'
    }
  } catch (caught) {
    error = caught instanceof Error ? caught.message : String(caught)
    console.error(`Job ${jobId} (${request.kind}) failed:`, caught)
  } finally {
    running.delete(jobId)
    void worker.terminate()
    startWaiting()
  }
  if (state !== 'done') await request.onEnd?.(state, error, jobId)
  await db('jobs')
    .where({ id: jobId })
    .update({ state, error: error?.slice(0, 2000) ?? null, ended_at: new Date() })
}

/** Asks a job to stop: at once when it is still waiting, else as soon as its thread looks. */
export async function cancelJob(jobId: number): Promise<void> {
  const active = running.get(jobId)
  if (active) {
    Atomics.store(active.cancel, 0, 1)
    return
  }
  const index = waiting.findIndex((entry) => entry.jobId === jobId)
  const [entry] = index >= 0 ? waiting.splice(index, 1) : []
  if (!entry) return
  await entry.request.onEnd?.('cancelled', null, jobId)
  await database()('jobs').where({ id: jobId }).update({ state: 'cancelled', ended_at: new Date() })
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
export async function openJobs(userId: number, kind: JobKind): Promise<number> {
  const [row] = await database()('jobs')
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
