import type { Kernels } from '../../app/solver/linear/kernels.ts'
import { prepareMultigrid } from '../../app/solver/linear/multigrid.ts'
import type { Prepared } from '../../app/solver/linear/system.ts'
import { type Problem, systemOf } from './problems.ts'
import { median } from './timing.ts'

/** Residual norm asked for, relative to the right-hand side's, from zero heads: what the library is asked for too. */
export const tolerance = 1e-8

export interface Measured {
  /** Seconds, medians. */
  setup: number
  solve: number
  iterations: number
  /** ||b - A x|| / ||b||, computed here from the links. */
  residual: number
  ended: string
  bytesPerCell: number
}

export function norm(values: Float64Array): number {
  let sum = 0
  for (let c = 0; c < values.length; c++) sum += (values[c] as number) ** 2
  return Math.sqrt(sum)
}

/** ||b - A x|| / ||b|| from the definition. */
export function relativeResidual({ columns, east, north, own, b }: Problem, x: Float64Array): number {
  const r = new Float64Array(b.length)
  for (let c = 0; c < b.length; c++)
    r[c] = (r[c] as number) + (b[c] as number) - (own[c] as number) * (x[c] as number)
  function flow(c: number, o: number, link: number): void {
    if (link === 0) return
    const q = link * ((x[c] as number) - (x[o] as number))
    r[c] = (r[c] as number) - q
    r[o] = (r[o] as number) + q
  }
  for (let c = 0; c < b.length; c++) {
    flow(c, c + 1, east[c] as number)
    flow(c, c + columns, north[c] as number)
  }
  return norm(r) / norm(b)
}

/** Times one problem; the first times, until V8 has compiled the kernels as well as it can, are thrown away. */
export function measure(problem: Problem, kernels: Kernels | undefined, repeats: number): Measured {
  const { b } = problem
  const x = new Float64Array(b.length)
  const system = systemOf(problem)
  const setups: number[] = []
  const solves: number[] = []
  let prepared: Prepared | undefined
  let iterations = 0
  let ended = ''
  const target = tolerance * norm(b)
  const warmUp = b.length < 100_000 ? 20 : 2
  for (let k = -warmUp; k < repeats; k++) {
    x.fill(0)
    const started = performance.now()
    prepared = prepareMultigrid(system, kernels, prepared)
    const ready = performance.now()
    const outcome = prepared.solve(b, x, { target, mostIterations: 500 })
    const done = performance.now()
    iterations = outcome.iterations
    ended = outcome.ended
    if (k < 0) continue
    setups.push((ready - started) / 1000)
    solves.push((done - ready) / 1000)
  }
  return {
    setup: median(setups),
    solve: median(solves),
    iterations,
    ended,
    residual: relativeResidual(problem, x),
    bytesPerCell: (prepared?.bytes ?? 0) / b.length,
  }
}
