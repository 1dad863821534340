import { correct, factor, residual, restrict, smooth, solveDirectly } from './plain-cycle'
import { axisOf, coarsened, coarsest, finest, type Level, padded } from './plain-grids'
import type { LinearOptions, LinearOutcome, LinearSystem, Prepared } from './system'

function at(values: Float64Array, c: number): number {
  return values[c] as number
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let c = 0; c < a.length; c++) sum += at(a, c) * at(b, c)
  return sum
}

/**
 * The plain twin of the compiled method: the same grids, interpolation and cycle in double precision, in the order of
 * the cells, one simple loop after the other. Serves where there are no kernels, and systems with links to corners.
 */
export function preparePlain(system: LinearSystem): Prepared {
  const levels = [finest(system)]
  let last = levels[0] as Level
  while (last.columns * last.rows > coarsest) {
    last = coarsened(last, axisOf(last))
    levels.push(last)
  }
  const l = factor(last)
  const y = new Float64Array(last.columns * last.rows)
  const fine = levels[0] as Level
  const { columns, rows } = system
  const n = fine.own.length
  const zero = new Float64Array(n)

  /** x of level k from its b; twice over from the third level on, where it costs little. */
  function cycle(k: number, again: boolean): void {
    const level = levels[k] as Level
    const coarse = levels[k + 1]
    if (!coarse || !level.down) {
      solveDirectly(level, l, y)
      return
    }
    if (!again) level.x.fill(0)
    smooth(level, false)
    residual(level, level.x, level.b, level.r)
    restrict(level, level.down, coarse)
    cycle(k + 1, false)
    if (k >= 2 && coarse.down) cycle(k + 1, true)
    correct(level, level.down, coarse)
    smooth(level, true)
  }

  function padIn(values: Float64Array, into: Float64Array): void {
    padded(values, into, columns, rows)
    for (let c = 0; c < n; c++) if (at(fine.inverse, c) === 0) into[c] = 0
  }

  function precondition(r: Float64Array, z: Float64Array): void {
    padIn(r, fine.b)
    cycle(0, false)
    for (let j = 0; j < rows; j++) {
      z.set(fine.x.subarray((j + 1) * fine.stride + 1, (j + 1) * fine.stride + 1 + columns), j * columns)
    }
  }

  /** Size that rounding alone gives the residual at x. */
  function roundingFloor(x: Float64Array, b: Float64Array): number {
    let sum = 0
    for (let c = 0; c < n; c++) {
      const unit = at(fine.inverse, c)
      if (unit > 0) sum += (at(x, c) / unit) ** 2 + at(b, c) ** 2
    }
    return Number.EPSILON * Math.sqrt(sum)
  }

  function solve(given: Float64Array, start: Float64Array, options: LinearOptions): LinearOutcome {
    const b = new Float64Array(n)
    const x = new Float64Array(n)
    const r = new Float64Array(n)
    const p = new Float64Array(n)
    const q = new Float64Array(n)
    padIn(given, b)
    padIn(start, x)
    if (dot(b, b) === 0) x.fill(0)
    let ended: LinearOutcome['ended'] = 'iterations'
    let iterations = 0
    let error = 0
    residual(fine, x, b, r)
    let norm = Math.sqrt(dot(r, r))
    let best = norm
    let idle = 0
    let old = 0
    if (norm <= options.target) ended = 'converged'
    while (ended === 'iterations' && iterations < options.mostIterations) {
      fine.b.set(r)
      cycle(0, false)
      const z = fine.x
      const now = dot(r, z)
      if (!(now > 0)) {
        ended = 'stalled'
        break
      }
      const beta = old > 0 ? now / old : 0
      old = now
      for (let c = 0; c < n; c++) p[c] = at(z, c) + beta * at(p, c)
      residual(fine, p, zero, q)
      const alpha = -now / dot(p, q)
      if (!(alpha > 0 && Number.isFinite(alpha))) {
        ended = 'stalled'
        break
      }
      error = 0
      for (let c = 0; c < n; c++) {
        const change = alpha * at(p, c)
        if (Math.abs(change) > error) error = Math.abs(change)
        x[c] = at(x, c) + change
        r[c] = at(r, c) + alpha * at(q, c)
      }
      iterations++
      norm = Math.sqrt(dot(r, r))
      if (norm <= options.target) {
        // The recurrence drifts away from the truth by rounding: the true residual decides, and is gone on from.
        residual(fine, x, b, r)
        norm = Math.sqrt(dot(r, r))
        if (norm <= options.target) ended = 'converged'
        else old = 0
      }
      if (options.watch?.(iterations, norm)) ended = 'cancelled'
      if (ended !== 'iterations') break
      if (norm < 0.9 * best) {
        best = norm
        idle = 0
      } else idle++
      if (norm <= roundingFloor(x, b) || idle >= 12) {
        residual(fine, x, b, r)
        norm = Math.sqrt(dot(r, r))
        if (norm <= options.target) ended = 'converged'
        else if (norm <= 4 * roundingFloor(x, b) || idle >= 12) ended = 'stalled'
        else old = 0
      }
    }
    residual(fine, x, b, r)
    norm = Math.sqrt(dot(r, r))
    for (let j = 0; j < rows; j++) {
      for (let i = 0; i < columns; i++) {
        const c = (j + 1) * fine.stride + i + 1
        if (at(fine.inverse, c) > 0) start[j * columns + i] = at(x, c)
      }
    }
    return { iterations, residual: norm, ended, error }
  }

  let bytes = 8 * l.length
  for (const level of levels) bytes += level.own.length * (9 * 8 + (level.down ? 4 * (8 + 4) : 0))
  return { solve, precondition, bytes }
}
