import type { KernelExports } from './kernels'
import { doubleArrays, type Grid, type Plan, singleArrays } from './plan'

/** Working sets up to this many bytes stay in the cache that a core has to itself. */
const cache = 200_000

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
  sums: Float64Array,
  { index, count, meet }: Part,
): Cycle {
  const { single, double, size, stride, grids } = plan
  const coarsest = grids.length - 1

  /**
   * Does the steps one after the other over all rows, in strips, so that what one leaves the next still finds in the
   * cache. A step needs its predecessor on the rows beside its own and stays so many rows behind. Where two parts of
   * the rows meet, what is left between them is done last, by the first thread.
   */
  function sweep(rows: number, columns: number, bytesOfRow: number, steps: Step[]): void {
    const parts = rows >= 16 * count && rows * columns >= 2048 ? count : 1
    const share = 2 * Math.ceil(rows / parts / 2)
    const start = index * share
    const end = Math.min(rows, start + share)
    if (index < parts) {
      const lines = Math.max(4, 2 * Math.floor(cache / bytesOfRow / 2))
      for (let j = start; j < end; j += lines) {
        const upper = Math.min(end, j + lines)
        for (const [behind, work] of steps) {
          const from = Math.max(start > 0 ? start + behind : 0, j - behind)
          const to = upper === rows ? rows : upper - behind
          if (from < to) work(from, to)
        }
      }
    }
    if (count === 1) return
    meet()
    if (parts === 1) return
    if (index === 0) {
      for (let seam = share; seam < rows; seam += share) {
        for (const [behind, work] of steps) {
          if (behind > 0) work(seam - behind, Math.min(rows, seam + behind))
        }
      }
    }
    meet()
  }

  function sumOver(own: number): number {
    sums[8 * index] = own
    if (count === 1) return own
    meet()
    let sum = 0
    for (let part = 0; part < count; part++) sum += sums[8 * part] as number
    meet()
    return sum
  }

  const top = grids[0] as Grid
  const topWay = plan.way
  const toTop = [topWay.shares, topWay.sharesSize, top.at, top.size, top.stride, top.half] as const
  const topRow = topWay.natural + 2 * topWay.apart * index
  const doubleRow = 2 * stride
  const restrictTop: Work = topWay.along
    ? (from, to) => k.restrictRedAlong(single, size, stride, ...toTop, topRow, from, to)
    : (from, to) =>
        k.restrictRedBoth(
          single,
          size,
          stride,
          ...toTop,
          topRow,
          from >> 1,
          to === plan.rows ? top.rows : to >> 1,
        )
  const correctTop: Work = topWay.along
    ? (from, to) => k.correctRedAlong(single, size, stride, ...toTop, topRow, from, to)
    : (from, to) =>
        k.correctRedBoth(single, size, stride, ...toTop, topRow, topWay.apart, from >> 1, (to + 1) >> 1)
  const blackOf =
    (source: number): Work =>
    (from, to) =>
      k.black(single, size, stride, source, from, to)
  const rest: Work = (from, to) => k.redRest(single, size, stride, from, to)

  /** Visits grid n: x from b, from x = 0 or, `again`, from where it is. */
  function visit(n: number, again: boolean): void {
    const grid = grids[n] as Grid
    const { rows, columns, way } = grid
    const g = [grid.at, grid.size, grid.stride, grid.half] as const
    if (n === coarsest) {
      if (index === 0) {
        const { inverse, width, unknowns } = plan
        k.dense(...g, columns, rows, inverse, width, inverse + unknowns * width)
      }
      if (count > 1) meet()
      return
    }
    const coarse = grids[n + 1] as Grid
    const row = way.natural + 2 * way.apart * index
    const to = [way.shares, way.sharesSize, coarse.at, coarse.size, coarse.stride, coarse.half] as const
    const restrict: Work = way.along
      ? (from, upper) => k.restrictAlong(...g, ...to, row, from, upper)
      : (from, upper) =>
          k.restrictBoth(...g, ...to, row, from >> 1, upper === rows ? coarse.rows : upper >> 1)
    const correct: Work = way.along
      ? (from, upper) => k.correctAlong(...g, ...to, row, from, upper)
      : (from, upper) => k.correctBoth(...g, ...to, row, way.apart, from >> 1, (upper + 1) >> 1)
    const bytes = 9 * grid.stride
    // Even rows first, odd ones behind them: the first odd row is row 1.
    if (again) {
      sweep(rows, columns, bytes, [
        [0, (from, upper) => k.relax(...g, from, upper, 0)],
        [1, (from, upper) => k.relax(...g, from | 1, upper, 0)],
        [2, (from, upper) => k.residual(...g, from, upper)],
        [4, restrict],
      ])
    } else {
      sweep(rows, columns, bytes, [
        [0, (from, upper) => k.startEven(...g, from, upper)],
        [1, (from, upper) => k.startOdd(...g, from | 1, upper)],
        [2, (from, upper) => k.startResidual(...g, from, upper)],
        [2, restrict],
      ])
    }
    visit(n + 1, false)
    if (n + 1 < coarsest) visit(n + 1, true)
    sweep(rows, columns, bytes, [
      [0, correct],
      [1, (from, upper) => k.relax(...g, from | 1, upper, 1)],
      [2, (from, upper) => k.relax(...g, from, upper, 1)],
    ])
  }

  const { rows, columns } = plan
  return {
    descend() {
      sweep(rows, columns, 7 * stride, [
        [0, blackOf(singleArrays.scaled)],
        [1, rest],
        [2, restrictTop],
      ])
    },
    step(alpha, scale, descend) {
      let sum = 0
      const first: Step = [
        0,
        (from, to) => {
          sum += k.step(single, size, stride, double, alpha, scale, from, to)
        },
      ]
      const steps: Step[] = descend
        ? [first, [1, blackOf(singleArrays.scaled)], [2, rest], [4, restrictTop]]
        : [first]
      sweep(rows, columns, 7 * stride + 4 * doubleRow, steps)
      return sumOver(sum)
    },
    up() {
      visit(0, false)
      let sum = 0
      sweep(rows, columns, 8 * stride + doubleRow, [
        [0, correctTop],
        [1, blackOf(singleArrays.z)],
        [
          2,
          (from, to) => {
            sum += k.redLast(single, size, stride, double, from, to)
          },
        ],
      ])
      return sumOver(sum)
    },
    product(beta) {
      let sum = 0
      sweep(rows, columns, stride + 9 * doubleRow, [
        [0, (from, to) => k.direction(single, size, stride, double, beta, from, to)],
        [1, (from, to) => k.eliminate(size, stride, double, doubleArrays.p, 0, from, to)],
        [
          2,
          (from, to) => {
            sum += k.product(size, stride, double, from, to)
          },
        ],
      ])
      return sumOver(sum)
    },
    trueResidual(scale) {
      let sum = 0
      sweep(rows, columns, stride + 9 * doubleRow, [
        [0, (from, to) => k.eliminate(size, stride, double, doubleArrays.redX, 1, from, to)],
        [
          1,
          (from, to) => {
            sum += k.trueResidual(single, size, stride, double, scale, from, to)
          },
        ],
      ])
      return sumOver(sum)
    },
    eliminate(source) {
      sweep(rows, columns, 9 * doubleRow, [
        [0, (from, to) => k.eliminate(size, stride, double, source, 1, from, to)],
      ])
    },
  }
}
