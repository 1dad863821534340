import { parentPort, Worker, workerData } from 'node:worker_threads'
import { encodeHeads } from './heads-buffer'
import { type Kernels, withTwoThreads } from './linear/kernels'
import type { Model } from './model'
import { ModelError } from './model-error'
import type { Result } from './result'
import { solveModel } from './solve'

/** What starts the thread: the parsed model, its hash for the result, and shared memory that says stop (not 0). */
export interface SolveRequest {
  model: Model
  input?: string
  cancel?: SharedArrayBuffer | Int32Array
  /** More are refused. */
  mostCells?: number
  /** Compiled once, by whoever starts threads. */
  kernels?: Kernels
}

/** What the thread posts: progress at most five times a second, then one of the others, once. */
export type SolveMessage =
  | { kind: 'progress'; iterations: number; residual: number; percent: number; phase: string }
  | { kind: 'done'; result: Result; buffer: ArrayBuffer }
  | { kind: 'refused'; path: string; message: string }
  | { kind: 'cancelled' }

const progressEvery = 200

/** A second thread for large systems, started when there is one; it ends with this thread. */
function withSecondThread(kernels: Kernels): Kernels {
  let worker: Worker | null = null
  function start(): Worker {
    const isSource = import.meta.url.endsWith('.ts')
    const file = new URL(isSource ? './linear/second.thread.ts' : './second.js', import.meta.url)
    // A thread of Node 20 does not take over `--import tsx`: it registers tsx itself, then loads the source.
    const code = `import('tsx/esm/api').then(({ register }) => { register(); return import(${JSON.stringify(file.href)}) })`
    const started = isSource ? new Worker(code, { eval: true }) : new Worker(file)
    // Without it the solve goes on alone.
    started.on('error', (error) => console.error('The second thread of a solve:', error))
    started.unref()
    return started
  }
  return withTwoThreads(kernels, {
    post(task) {
      worker ??= start()
      worker.postMessage(task)
    },
  })
}

function run(
  { model, input, mostCells, cancel, kernels }: SolveRequest,
  post: (message: SolveMessage, move?: ArrayBuffer[]) => void,
): void {
  const flag = cancel instanceof Int32Array ? cancel : cancel ? new Int32Array(cancel) : null
  let last = Number.NEGATIVE_INFINITY
  try {
    const solution = solveModel(model, {
      input,
      mostCells,
      kernels: kernels && withSecondThread(kernels),
      isCancelled: () => flag !== null && Atomics.load(flag, 0) !== 0,
      onProgress: (progress) => {
        const now = performance.now()
        if (now - last < progressEvery) return
        last = now
        post({ kind: 'progress', ...progress })
      },
    })
    if (solution.cancelled) {
      post({ kind: 'cancelled' })
      return
    }
    const buffer = encodeHeads(solution.grid, solution.fields.length > 0 ? solution.fields : solution.heads)
    post({ kind: 'done', result: solution.result, buffer }, [buffer])
  } catch (error) {
    if (!(error instanceof ModelError)) throw error
    post({ kind: 'refused', path: error.path, message: error.message })
  }
}

const port = parentPort
if (!port) throw new Error('solve.thread.ts runs on a worker thread only')
run(workerData as SolveRequest, (message, move) => port.postMessage(message, move ?? []))
