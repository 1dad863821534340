import { parentPort, workerData } from 'node:worker_threads'
import { encodeHeads } from './heads-buffer'
import type { Kernels } from './linear/kernels'
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
      kernels,
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
