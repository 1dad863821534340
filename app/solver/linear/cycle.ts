import type { KernelExports } from './kernels'
import { doubleArrays, type Grid, type Plan, singleArrays } from './plan'

/** Working sets up to this many bytes stay in the cache that a core has to itself. */
const cache = 400_000
/** Grids of fewer cells are done by one thread while the others wait. */
const worthSharing = 4096

/** Works on the rows from..to - 1. */
type Work = (from: number, to: number) => void

/** One step of a sweep, so many rows behind the first. */
type Step = [behind: number, work: Work]

/**
 * One thread's part of the work. Every thread runs the same program on its own part of the rows; `meet` returns when
 * all have come to it.
 */
export interface Part {
  index: number
  count: number
  meet: () => void
}

export interface Cycle {
  /** z of the scaled residual, one symmetric cycle; returns scale * (r . z) summed over the parts. */
  up: () => number
  /** x += alpha p, r -= alpha q; the cycle's way down, if wanted. Returns r . r. */
  step: (alpha: number, scale: number, descend: boolean) => number
  /** The cycle's way down alone. */
  descend: () => void
  /** p = z + beta p and q = A p; returns p . q. */
  product: (beta: number) => number
  /** r = b - A x from its definition, b being laid out in the place of q and black; returns r . r. */
  trueResidual: (scale: number) => number
  /** Black cells of a red array's solution, their right-hand side laid out in the place of black. */
  eliminate: (source: number) => void
}

/** The multigrid cycle and the steps of conjugate gradients for one thread's part of the rows. */
export function cycleOf(
  plan: Plan,
  k: KernelExports,
  doubles: Float64Array,
  { index, count, meet }: Part,
): Cycle {
  const { single, double, size, stride, grids } = plan
  const coarsest = grids.length - 1
  const sums = doubles.subarray(plan.sums / 8)

  /** Is this thread on its own, at least for now? */
  let alone = count === 1

  /**
   * Does the steps one after the other over all rows, in strips, so that what one leaves the next still finds in the
   * cache. A step needs its predecessor on the rows beside its own and stays so many rows behind. Where two parts of
   * the rows meet, what is left between them is done last, by the first thread.
   */
  function sweep(rows: number, bytesOfRow: number, steps: Step[]): void {
    const share = alone ? rows : 2 * Math.ceil(rows / count / 2)
    const start = alone ? 0 : index * share
    const end = Math.min(rows, start + share)
    const lines = Math.max(4, 2 * Math.floor(cache / bytesOfRow / 2))
    for (let j = start; j < end; j += lines) {
      const upper = Math.min(end, j + lines)
      for (const [behind, work] of steps) {
        const from = Math.max(start > 0 ? start + behind : 0, j - behind)
        const to = upper === rows ? rows : upper - behind
        if (from < to) work(from, to)
      }
    }
    if (alone) return
    meet()
    if (index === 0) {
      for (let seam = share; seam < rows; seam += share) {
        for (const [behind, work] of steps) {
          if (behind > 0) work(seam - behind, Math.min(rows, seam + behind))
        }
      }
    }
    meet()
  }

  // Two places a part, used in turn: by the time one is written again everybody has read it.
  let turn = 0
  function sumOver(own: number): number {
    if (alone) return own
    turn = 1 - turn
    sums[8 * index + turn] = own
    meet()
    let sum = 0
    for (let part = 0; part < count; part++) sum += sums[8 * part + turn] as number
    return sum
  }

  const top = grids[0] as Grid
  const topWay = plan.way
  const toTop = [topWay.shares, topWay.sharesSize, top.at, top.size, top.stride, top.half] as const
  const topRow = topWay.natural + 2 * topWay.apart * index
  const doubleRow = 2 * stride
  const { rows } = plan
  const { restrictRedAlong, restrictRedBoth, correctRedAlong, correctRedBoth } = k
  const restrictTop: Work = topWay.along
    ? (from, to) => restrictRedAlong(single, size, stride, ...toTop, topRow, from, to)
    : (from, to) =>
        restrictRedBoth(single, size, stride, ...toTop, topRow, from >> 1, to === rows ? top.rows : to >> 1)
  const correctTop: Work = topWay.along
    ? (from, to) => correctRedAlong(single, size, stride, ...toTop, topRow, from, to)
    : (from, to) =>
        correctRedBoth(single, size, stride, ...toTop, topRow, topWay.apart, from >> 1, (to + 1) >> 1)
  const blackOfScaled: Work = (from, to) => k.black(single, size, stride, singleArrays.scaled, from, to)
  const blackOfZ: Work = (from, to) => k.black(single, size, stride, singleArrays.z, from, to)
  const rest: Work = (from, to) => k.redRest(single, size, stride, from, to)

  // The first coarse grid, which costs most, is relaxed once a way; the smaller ones twice.
  const visits = grids
    .slice(0, -1)
    .map((grid, n) => visitOf(grid, grids[n + 1] as Grid, index, k, n === 0 ? 1 : 2))

  /** Visits grid n: x from b, from x = 0 or, `again`, from where it is. */
  function visit(n: number, again: boolean): void {
    const grid = grids[n] as Grid
    if (!alone && grid.columns * grid.rows < worthSharing) {
      if (index === 0) {
        alone = true
        visit(n, again)
        alone = false
      }
      meet()
      return
    }
    const own = visits[n]
    if (!own) {
      const { at, size: bytes, stride: row, half } = grid
      const { inverse, width, unknowns } = plan
      k.dense(at, bytes, row, half, grid.columns, grid.rows, inverse, width, inverse + unknowns * width)
      return
    }
    const bytes = 9 * grid.stride
    sweep(grid.rows, bytes, again ? own.again : own.start)
    visit(n + 1, false)
    // A coarse grid visited twice costs little and mends what coarser grids represent badly (W-cycle).
    if (n + 1 < coarsest) visit(n + 1, true)
    sweep(grid.rows, bytes, own.up)
  }

  // What the steps below take and leave.
  let factor = 0
  let scaling = 1
  let source = 0
  let sum = 0
  const stepping: Step[] = [
    [
      0,
      (from, to) => {
        sum += k.step(single, size, stride, double, factor, scaling, from, to)
      },
    ],
  ]
  const steppingDown: Step[] = [...stepping, [1, blackOfScaled], [2, rest], [4, restrictTop]]
  const descending: Step[] = [
    [0, blackOfScaled],
    [1, rest],
    [2, restrictTop],
  ]
  const ascending: Step[] = [
    [0, correctTop],
    [1, blackOfZ],
    [
      2,
      (from, to) => {
        sum += k.redLast(single, size, stride, double, from, to)
      },
    ],
  ]
  const multiplying: Step[] = [
    [0, (from, to) => k.direction(single, size, stride, double, factor, from, to)],
    [1, (from, to) => k.eliminate(size, stride, double, doubleArrays.p, 0, from, to)],
    [
      2,
      (from, to) => {
        sum += k.product(size, stride, double, from, to)
      },
    ],
  ]
  const eliminating: Step[] = [[0, (from, to) => k.eliminate(size, stride, double, source, 1, from, to)]]
  const resting: Step[] = [
    ...eliminating,
    [
      1,
      (from, to) => {
        sum += k.trueResidual(single, size, stride, double, scaling, from, to)
      },
    ],
  ]
  function run(bytesOfRow: number, steps: Step[]): number {
    sum = 0
    sweep(rows, bytesOfRow, steps)
    return sumOver(sum)
  }

  return {
    descend() {
      sweep(rows, 7 * stride, descending)
    },
    step(alpha, scale, descend) {
      factor = alpha
      scaling = scale
      return run(7 * stride + 4 * doubleRow, descend ? steppingDown : stepping)
    },
    up() {
      visit(0, false)
      return run(8 * stride + doubleRow, ascending)
    },
    product(beta) {
      factor = beta
      return run(stride + 9 * doubleRow, multiplying)
    },
    trueResidual(scale) {
      source = doubleArrays.redX
      scaling = scale
      return run(stride + 9 * doubleRow, resting)
    },
    eliminate(red) {
      source = red
      sweep(rows, 9 * doubleRow, eliminating)
    },
  }
}

interface Visit {
  /** Down from x = 0, or from where x is; and up again. */
  start: Step[]
  again: Step[]
  up: Step[]
}

/**
 * The steps of a visit to a nine-point grid, `sweeps` relaxations each way. Even rows come first, odd ones behind them:
 * the first odd row is row 1.
 */
function visitOf(grid: Grid, coarse: Grid, index: number, k: KernelExports, sweeps: number): Visit {
  const { at, size, stride, half, rows, way } = grid
  const row = way.natural + 2 * way.apart * index
  const to = [way.shares, way.sharesSize, coarse.at, coarse.size, coarse.stride, coarse.half] as const
  const { restrictAlong, restrictBoth, correctAlong, correctBoth } = k
  const restrict: Work = way.along
    ? (from, upper) => restrictAlong(at, size, stride, half, ...to, row, from, upper)
    : (from, upper) =>
        restrictBoth(at, size, stride, half, ...to, row, from >> 1, upper === rows ? coarse.rows : upper >> 1)
  const correct: Work = way.along
    ? (from, upper) => correctAlong(at, size, stride, half, ...to, row, from, upper)
    : (from, upper) => correctBoth(at, size, stride, half, ...to, row, way.apart, from >> 1, (upper + 1) >> 1)
  const even: Work = (from, upper) => k.relax(at, size, stride, half, from, upper, 0)
  const odd: Work = (from, upper) => k.relax(at, size, stride, half, from | 1, upper, 0)
  const oddBack: Work = (from, upper) => k.relax(at, size, stride, half, from | 1, upper, 1)
  const evenBack: Work = (from, upper) => k.relax(at, size, stride, half, from, upper, 1)
  const residual: Work = (from, upper) => k.residual(at, size, stride, half, from, upper)
  const startEven: Work = (from, upper) => k.startEven(at, size, stride, half, from, upper)
  const startOdd: Work = (from, upper) => k.startOdd(at, size, stride, half, from | 1, upper)
  const startResidual: Work = (from, upper) => k.startResidual(at, size, stride, half, from, upper)

  const starting: Step[] = [
    [0, startEven],
    [1, startOdd],
  ]
  const again: Step[] = []
  const up: Step[] = [[0, correct]]
  for (let n = 0; n < sweeps; n++) {
    again.push([2 * n, even], [2 * n + 1, odd])
    up.push([2 * n + 1, oddBack], [2 * n + 2, evenBack])
  }
  const last = 2 * sweeps
  const down: Step[] = [
    [last, residual],
    [last + 2, restrict],
  ]
  return {
    start:
      sweeps === 1
        ? [...starting, [2, startResidual], [2, restrict]]
        : [...starting, ...again.slice(2), ...down],
    again: [...again, ...down],
    up,
  }
}
