import { type Cycle, cycleOf } from './cycle'
import type { KernelExports, Kernels } from './kernels'
import {
  doubleArrays,
  type Grid,
  nineArrays,
  type Plan,
  planCoarser,
  planFinest,
  planInverse,
  take,
  upTo,
} from './plan'
import type { LinearOptions, LinearOutcome, LinearSystem, Prepared } from './system'

/** A grid of at most so many cells is solved directly. */
const coarsest = 64
/** Links along rows stronger than those across by this factor (geometric mean): leave out only columns. */
const leaning = 3

/** Geometric mean of how much stronger one direction's links are than the other's, of a sample of the cells. */
function lean(cells: number, along: (c: number) => number, across: (c: number) => number): number {
  let sum = 0
  let count = 0
  const step = Math.max(1, Math.floor(cells / 2003))
  for (let c = 0; c < cells; c += step) {
    const ratio = along(c) / across(c)
    if (ratio > 0 && ratio < Number.POSITIVE_INFINITY) {
      sum += Math.log(ratio)
      count++
    }
  }
  return count > 0 ? Math.exp(sum / count) : 1
}

function leanOf({ columns, rows, east, north }: LinearSystem): number {
  return lean(
    columns * rows,
    (c) => east[c] as number,
    (c) => north[c] as number,
  )
}

function transposed(values: Float64Array, columns: number, rows: number): Float64Array {
  const out = new Float64Array(values.length)
  for (let first = 0; first < rows; first += 32) {
    for (let i = 0; i < columns; i++) {
      for (let j = first; j < Math.min(rows, first + 32); j++) {
        out[i * rows + j] = values[j * columns + i] as number
      }
    }
  }
  return out
}

/**
 * Makes a five-point system ready for the compiled kernels. Where links across rows are much the stronger ones rows
 * and columns change places, so that only one direction needs kernels of its own.
 */
export function prepareCompiled(system: LinearSystem, kernels: Kernels): Prepared {
  const { columns, rows } = system
  const turned = rows > 1 && (columns === 1 || leanOf(system) < 1 / leaning)
  if (!turned) return prepareRows(system, kernels)
  const inner = prepareRows(
    {
      columns: rows,
      rows: columns,
      east: transposed(system.north, columns, rows),
      north: transposed(system.east, columns, rows),
      northEast: null,
      northWest: null,
      own: transposed(system.own, columns, rows),
    },
    kernels,
  )
  return {
    solve(b, x, options) {
      const solution = transposed(x, columns, rows)
      const outcome = inner.solve(transposed(b, columns, rows), solution, options)
      x.set(transposed(solution, rows, columns))
      return outcome
    },
    precondition(r, z) {
      const made = new Float64Array(z.length)
      inner.precondition(transposed(r, columns, rows), made)
      z.set(transposed(made, rows, columns))
    },
  }
}

/** Memory that grows, its views and the kernels that work in it. */
interface Machine {
  kernels: KernelExports
  floats: Float32Array
  doubles: Float64Array
  grow: (bytes: number) => void
}

export function machineOf(kernels: Kernels): Machine {
  const memory = new WebAssembly.Memory({ initial: 1, maximum: 65536 })
  const instance = new WebAssembly.Instance(kernels.module, { env: { memory } })
  const machine: Machine = {
    kernels: instance.exports as unknown as KernelExports,
    floats: new Float32Array(memory.buffer),
    doubles: new Float64Array(memory.buffer),
    grow(bytes) {
      const missing = Math.ceil((bytes + 64 - memory.buffer.byteLength) / 65536)
      if (missing <= 0) return
      memory.grow(missing)
      machine.floats = new Float32Array(memory.buffer)
      machine.doubles = new Float64Array(memory.buffer)
    },
  }
  return machine
}

/** Lays the system out and makes all coarser grids. */
export function setUp(system: LinearSystem, machine: Machine): Plan {
  const { columns, rows } = system
  const { kernels: k } = machine
  const plan = planFinest(columns, rows, rows === 1 || (leanOf(system) > leaning && columns > 2))
  machine.grow(plan.bytes)
  const { single, double, size, stride, staged, stage } = plan
  for (let from = 0; from < rows; from += staged) {
    const to = Math.min(rows, from + staged)
    const north = stage + 8 * columns * staged
    const own = north + 8 * columns * (staged + 1)
    machine.doubles.set(system.east.subarray(from * columns, to * columns), stage / 8)
    machine.doubles.set(system.own.subarray(from * columns, to * columns), own / 8)
    // With the row below; there is none below the first.
    const below = Math.max(0, from - 1)
    const place = north / 8 + (from > 0 ? 0 : columns)
    machine.doubles.set(system.north.subarray(below * columns, to * columns), place)
    k.load5(single, size, stride, double, columns, rows, stage, north, own, from, to)
  }
  let last = plan.grids[0] as Grid
  const toFirst = [plan.way.shares, plan.way.sharesSize, last.at, last.size, last.stride, last.half] as const
  if (plan.way.along) {
    k.galerkinRedAlong(size, stride, double, columns, ...toFirst, 0, last.rows)
  } else {
    k.sharesRedBoth(size, stride, double, columns, rows, plan.way.shares, plan.way.sharesSize, 0, last.rows)
    k.galerkinRedBoth(size, stride, double, columns, ...toFirst, 0, last.rows)
  }
  k.invert(last.at, last.size, last.stride, last.half, 0, last.rows)
  while (last.columns * last.rows > coarsest) last = coarsened(plan, last, machine)
  planInverse(plan)
  machine.grow(plan.bytes)
  const inverse = inverseOf(last, machine)
  for (let row = 0; row < plan.unknowns; row++) {
    const values = inverse.subarray(row * plan.unknowns, (row + 1) * plan.unknowns)
    machine.floats.set(values, (plan.inverse + row * plan.width) / 4)
  }
  return plan
}

/** Number of a grid's array at its cell c. */
export function numberAt(grid: Grid, machine: Machine, array: number, c: number): number {
  const i = c % grid.columns
  const row = grid.at + array * grid.size + (Math.floor(c / grid.columns) + 1) * grid.stride + 16
  return machine.floats[(row + (i & 1) * grid.half) / 4 + (i >> 1)] as number
}

function coarsened(plan: Plan, fine: Grid, machine: Machine): Grid {
  const { kernels: k } = machine
  function strength(c: number, array: number): number {
    const corners =
      numberAt(fine, machine, nineArrays.northEast, c) + numberAt(fine, machine, nineArrays.northWest, c)
    return numberAt(fine, machine, array, c) + corners
  }
  const ratio = lean(
    fine.columns * fine.rows,
    (c) => strength(c, nineArrays.east),
    (c) => strength(c, nineArrays.north),
  )
  const along = fine.rows === 1 || (ratio > leaning && fine.columns > 2)
  const coarse = planCoarser(plan, along)
  const apart = upTo(8 * (coarse.columns + 2), 64)
  const middles = along ? 0 : take(plan, 8 * apart)
  machine.grow(plan.bytes)
  const { shares, sharesSize } = fine.way
  const from = [
    fine.at,
    fine.size,
    fine.stride,
    fine.half,
    fine.columns,
    fine.rows,
    shares,
    sharesSize,
  ] as const
  const to = [coarse.at, coarse.size, coarse.stride, coarse.half] as const
  k.sharesOf(...from, along ? 1 : 0, 0, coarse.rows)
  if (along) k.galerkinAlong(...from, ...to, 0, coarse.rows)
  else k.galerkinBoth(...from, ...to, middles, apart, 0, coarse.rows)
  k.invert(...to, 0, coarse.rows)
  return coarse
}

/** Inverse of the coarsest grid's matrix by Cholesky's factor; a pivot lost to rounding leaves its cell at 0. */
function inverseOf(grid: Grid, machine: Machine): Float64Array {
  const { columns } = grid
  const n = columns * grid.rows
  const l = new Float64Array(n * n)
  function at(array: number, c: number): number {
    return numberAt(grid, machine, array, c)
  }
  function link(row: number, column: number, value: number): void {
    if (value === 0) return
    l[row * n + column] = -value
    l[row * n + row] = (l[row * n + row] as number) + value
    l[column * n + column] = (l[column * n + column] as number) + value
  }
  for (let c = 0; c < n; c++) {
    l[c * n + c] = (l[c * n + c] as number) + at(nineArrays.own, c)
    link(c + 1, c, at(nineArrays.east, c))
    link(c + columns, c, at(nineArrays.north, c))
    link(c + columns + 1, c, at(nineArrays.northEast, c))
    link(c + columns - 1, c, at(nineArrays.northWest, c))
  }
  // L below the diagonal; on it 1 / L_kk, 0 for a lost pivot.
  for (let k = 0; k < n; k++) {
    const whole = l[k * n + k] as number
    let pivot = whole
    for (let m = 0; m < k; m++) pivot -= (l[k * n + m] as number) ** 2
    const unit = pivot > 1e-14 * whole ? 1 / Math.sqrt(pivot) : 0
    l[k * n + k] = unit
    for (let i = k + 1; i < n; i++) {
      let value = l[i * n + k] as number
      for (let m = 0; m < k; m++) value -= (l[i * n + m] as number) * (l[k * n + m] as number)
      l[i * n + k] = value * unit
    }
  }
  // Row c of `lower`: row c of the inverse of L.
  const lower = new Float64Array(n * n)
  for (let i = 0; i < n; i++) {
    const unit = l[i * n + i] as number
    lower[i * n + i] = unit
    for (let m = 0; m < i; m++) {
      const factor = unit * (l[i * n + m] as number)
      if (factor === 0) continue
      for (let c = 0; c <= m; c++) {
        lower[i * n + c] = (lower[i * n + c] as number) - factor * (lower[m * n + c] as number)
      }
    }
  }
  const inverse = new Float64Array(n * n)
  for (let m = 0; m < n; m++) {
    for (let i = 0; i <= m; i++) {
      const factor = lower[m * n + i] as number
      if (factor === 0) continue
      for (let c = 0; c <= m; c++) {
        inverse[i * n + c] = (inverse[i * n + c] as number) + factor * (lower[m * n + c] as number)
      }
    }
  }
  return inverse
}

function prepareRows(system: LinearSystem, kernels: Kernels): Prepared {
  const machine = machineOf(kernels)
  const plan = setUp(system, machine)
  const { kernels: k, doubles } = machine
  const { columns, rows, single, double, size, stride, stage, staged } = plan
  const cycle = cycleOf(plan, k, doubles.subarray(plan.sums / 8), { index: 0, count: 1, meet: () => {} })

  /** Lays numbers in the order of the cells out by colours, in the places of two arrays. */
  function layOut(values: Float64Array, red: number, black: number): void {
    for (let from = 0; from < rows; from += staged) {
      const to = Math.min(rows, from + staged)
      doubles.set(values.subarray(from * columns, to * columns), stage / 8)
      k.parted(size, stride, double, columns, stage, red, black, from, to)
    }
  }

  /** The other way; cells without an equation keep what they have. */
  function bringBack(values: Float64Array, red: number): void {
    for (let from = 0; from < rows; from += staged) {
      const to = Math.min(rows, from + staged)
      const part = values.subarray(from * columns, to * columns)
      doubles.set(part, stage / 8)
      k.joined(single, size, stride, double, columns, stage, red, doubleArrays.blackOwn, from, to)
      part.set(doubles.subarray(stage / 8, stage / 8 + part.length))
    }
  }

  function solve(b: Float64Array, x: Float64Array, options: LinearOptions): LinearOutcome {
    if (b.every((value) => value === 0)) x.fill(0)
    layOut(x, doubleArrays.redX, doubleArrays.blackOwn)
    const outcome = conjugateGradients(cycle, options, {
      layOut: () => layOut(b, doubleArrays.q, doubleArrays.blackOwn),
      largest: () => k.largest(size, stride, double, doubleArrays.p, 0, rows),
    })
    bringBack(x, doubleArrays.redX)
    return outcome
  }

  function precondition(r: Float64Array, z: Float64Array): void {
    let most = 0
    for (let c = 0; c < r.length; c++) most = Math.max(most, Math.abs(r[c] as number))
    z.fill(0)
    if (most === 0) return
    // Single precision has no room for numbers far from 1.
    const scale = 1 / most
    layOut(z, doubleArrays.redX, doubleArrays.blackOwn)
    layOut(r, doubleArrays.q, doubleArrays.blackOwn)
    cycle.trueResidual(scale)
    cycle.descend()
    cycle.up()
    cycle.product(0)
    // Black cells in the same scale.
    layOut(
      r.map((value) => value * scale),
      doubleArrays.q,
      doubleArrays.blackOwn,
    )
    cycle.eliminate(doubleArrays.p)
    bringBack(z, doubleArrays.p)
    for (let c = 0; c < z.length; c++) z[c] = (z[c] as number) * most
  }

  return { solve, precondition }
}

interface Surroundings {
  /** Lays the right-hand side out where the true residual is formed from it. */
  layOut: () => void
  /** Largest |p|. */
  largest: () => number
}

/** Preconditioned conjugate gradients (Hestenes & Stiefel 1952) from where x is. */
function conjugateGradients(
  cycle: Cycle,
  { target, mostIterations, watch }: LinearOptions,
  { layOut, largest }: Surroundings,
): LinearOutcome {
  layOut()
  let norm = Math.sqrt(cycle.trueResidual(1))
  const scale = norm > 0 ? 1 / norm : 1
  if (norm > 0) {
    layOut()
    cycle.trueResidual(scale)
  }
  let truth = norm
  let iterations = 0
  let before = norm
  let old = 0
  let alpha = 0
  let ended: LinearOutcome['ended'] | null = norm <= target ? 'converged' : null
  let descended = false
  while (ended === null) {
    if (iterations >= mostIterations) {
      ended = 'iterations'
      break
    }
    if (!descended) cycle.descend()
    const now = cycle.up()
    const pq = now > 0 ? cycle.product(old > 0 ? now / old : 0) : 0
    if (!(pq > 0)) {
      ended = 'stalled'
      break
    }
    old = now
    alpha = now / pq
    // No way down when this step is likely to be the last.
    descended = norm * Math.min(1, norm / before) > 2 * target
    before = norm
    norm = Math.sqrt(cycle.step(alpha, scale, descended))
    iterations++
    if (norm <= target) {
      // Rounding lets the recurrence run ahead of the truth: the true residual decides, and is gone on from.
      layOut()
      norm = Math.sqrt(cycle.trueResidual(scale))
      descended = false
      if (norm <= target) ended = 'converged'
      else if (norm > 0.5 * truth) ended = 'stalled'
      truth = norm
      before = norm
      old = 0
    }
    if (watch?.(iterations, norm) && ended !== 'converged') ended = 'cancelled'
  }
  const error = alpha * largest()
  layOut()
  const residual = Math.sqrt(cycle.trueResidual(scale))
  return { iterations, residual, ended, error }
}
