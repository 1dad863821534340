import { instantiateKernels } from '../../app/solver/linear/kernels.ts'
import { prepareMultigrid } from '../../app/solver/linear/multigrid.ts'
import { norm, tolerance } from './measure.ts'
import { type Kind, problemOf, systemOf } from './problems.ts'
import { quantile } from './timing.ts'

export interface LiveTime {
  kind: Kind
  /** Milliseconds from a well's move to new heads. */
  middle: number
  p95: number
}

/**
 * Moves one well about on a grid of n x n cells, `moves` times, each from the heads before, and times every solve; the
 * grid and its ground stay, so nothing is set up anew. Runs in Node and in a web worker.
 */
export function moveOneWell(bytes: Uint8Array<ArrayBuffer>, kind: Kind, n: number, moves: number): LiveTime {
  const problem = problemOf(kind, n)
  const prepared = prepareMultigrid(systemOf(problem), instantiateKernels(bytes))
  const { b } = problem
  const x = new Float64Array(b.length)
  const rate = 0.4
  const milliseconds: number[] = []
  let well = -1
  const warmUp = 60
  for (let k = 0; k < warmUp + moves; k++) {
    if (well >= 0) b[well] = (b[well] as number) + rate
    // Along a spiral, a few cells at a time, as a hand would drag it.
    const angle = 0.13 * k
    const far = n * (0.05 + 0.1 * (0.5 + 0.5 * Math.sin(0.037 * k)))
    const i = Math.round(0.42 * n + far * Math.cos(angle))
    const j = Math.round(0.5 * n + far * Math.sin(angle))
    well = j * n + i
    b[well] = (b[well] as number) - rate
    const target = tolerance * norm(b)
    const started = performance.now()
    prepared.solve(b, x, { target, mostIterations: 100 })
    if (k >= warmUp) milliseconds.push(performance.now() - started)
  }
  return { kind, middle: quantile(milliseconds, 0.5), p95: quantile(milliseconds, 0.95) }
}
