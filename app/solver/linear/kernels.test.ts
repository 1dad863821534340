import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { describe, expect, it } from 'vitest'
import { machineOf, setUp } from './compiled'
import { cycleOf } from './cycle'
import { instantiateKernels } from './kernels'
import { correct, residual, restrict, smooth } from './plain-cycle'
import { coarsened, finest, type Level } from './plain-grids'
import { doubleArrays, type Grid, nineArrays, type Plan, singleArrays } from './plan'
import type { LinearSystem } from './system'

const kernels = instantiateKernels(
  new Uint8Array(readFileSync(join(process.cwd(), '.data/kernels/solver.wasm'))),
)

function numbersFrom(seed: number): () => number {
  let state = seed
  return () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0
    return (state + 0.5) / 4294967296
  }
}

/** Rough ground, `lean` times as conductive along x, a few cells held. */
function system(columns: number, rows: number, lean: number): LinearSystem {
  const next = numbersFrom(columns)
  const n = columns * rows
  const numbers = () => new Float64Array(n)
  const [east, north, own] = [numbers(), numbers(), numbers()]
  for (let c = 0; c < n; c++) {
    if (c % columns < columns - 1) east[c] = lean * Math.exp(4 * next())
    if (c < n - columns) north[c] = Math.exp(4 * next())
    if (next() < 0.05) own[c] = next()
  }
  own[0] = 1
  return { columns, rows, east, north, northEast: null, northWest: null, own }
}

const cases: [columns: number, rows: number, lean: number][] = [
  [41, 38, 1],
  [46, 33, 10],
  [37, 40, 200],
]

type Machine = ReturnType<typeof machineOf>

/** The compiled grids and their plain twins, coarsened the same way. */
function both(columns: number, rows: number, lean: number) {
  const given = system(columns, rows, lean)
  const machine = machineOf(kernels, false)
  const plan = setUp(given, machine)
  const levels: Level[] = [finest(given)]
  let { along } = plan.way
  for (const grid of plan.grids) {
    levels.push(coarsened(levels[levels.length - 1] as Level, along ? 'x' : 'both'))
    along = grid.way.along
  }
  return { machine, plan, levels }
}

function placeIn(grid: Grid, array: number, i: number, j: number): number {
  const row = grid.at + array * grid.size + (j + 1) * grid.stride + 16
  return (row + (i & 1) * grid.half) / 4 + (i >> 1)
}

function placeInColours(plan: Plan, array: number, i: number, j: number): number {
  return (plan.single + array * plan.size + (j + 2) * plan.stride + 16) / 4 + (i >> 1)
}

function doublePlace(plan: Plan, array: number, i: number, j: number): number {
  return (plan.double + 2 * (array * plan.size + (j + 2) * plan.stride + 16)) / 8 + (i >> 1)
}

function eachCell(level: Level, visit: (i: number, j: number, c: number) => void): void {
  for (let j = 0; j < level.rows; j++) {
    for (let i = 0; i < level.columns; i++) visit(i, j, (j + 1) * level.stride + i + 1)
  }
}

function largest(values: Float64Array): number {
  return values.reduce((most, value) => Math.max(most, Math.abs(value)), 0)
}

/** Largest difference of a compiled array from a plain one, relative to the largest number. */
function apart(machine: Machine, grid: Grid, array: number, level: Level, plain: Float64Array): number {
  let most = 0
  eachCell(level, (i, j, c) => {
    const value = machine.floats[placeIn(grid, array, i, j)] as number
    most = Math.max(most, Math.abs(value - (plain[c] as number)))
  })
  return most / largest(plain)
}

describe.each(cases)('on %i x %i cells, %i times as conductive along x, the kernels', (...given) => {
  it('make the coarse matrices of the plain twin', () => {
    const { machine, plan, levels } = both(...given)
    plan.grids.forEach((grid, n) => {
      const level = levels[n + 1] as Level
      const diagonal = level.inverse.map((value) => (value > 0 ? 1 / value : 0))
      const arrays: [number, Float64Array][] = [
        [nineArrays.east, level.east],
        [nineArrays.north, level.north],
        [nineArrays.northEast, level.northEast],
        [nineArrays.northWest, level.northWest],
        [nineArrays.own, level.own],
      ]
      eachCell(level, (i, j, c) => {
        for (const [array, plain] of arrays) {
          const value = machine.floats[placeIn(grid, array, i, j)] as number
          expect(Math.abs(value - (plain[c] as number))).toBeLessThan(2e-6 * (diagonal[c] as number))
        }
      })
      expect(apart(machine, grid, nineArrays.inverse, level, level.inverse)).toBeLessThan(1e-5)
    })
  })

  it('sweep, rest and restrict on nine points as the plain twin does, from zero and from anywhere', () => {
    const { machine, plan, levels } = both(...given)
    const { kernels: k } = machine
    const next = numbersFrom(3)
    const [grid, coarse] = plan.grids as [Grid, Grid]
    const [, level, below] = levels as [Level, Level, Level]
    const { at, size, stride, half, rows, way } = grid
    const to = [way.shares, way.sharesSize, coarse.at, coarse.size, coarse.stride, coarse.half] as const
    eachCell(level, (i, j, c) => {
      level.b[c] = next() - 0.5
      level.x[c] = 0
      machine.floats[placeIn(grid, nineArrays.b, i, j)] = level.b[c] as number
    })
    function compare(): void {
      const way = level.down
      if (!way) throw new Error('a level without a coarser one')
      smooth(level, false)
      residual(level, level.x, level.b, level.r)
      restrict(level, way, below)
      expect(apart(machine, grid, nineArrays.x, level, level.x)).toBeLessThan(1e-5)
      expect(apart(machine, coarse, nineArrays.b, below, below.b)).toBeLessThan(2e-5)
    }
    const goDown = grid.way.along ? k.restrictAlong : k.restrictBoth
    k.startEven(at, size, stride, half, 0, rows)
    k.startOdd(at, size, stride, half, 1, rows)
    k.startResidual(at, size, stride, half, 0, rows)
    goDown(at, size, stride, half, ...to, way.natural, 0, coarse.rows)
    compare()
    k.relax(at, size, stride, half, 0, rows, 0)
    k.relax(at, size, stride, half, 1, rows, 0)
    k.residual(at, size, stride, half, 0, rows)
    goDown(at, size, stride, half, ...to, way.natural, 0, coarse.rows)
    compare()
    // And up again: corrected by what the coarse grid holds, then swept backwards.
    eachCell(below, (i, j, c) => {
      below.x[c] = next() - 0.5
      machine.floats[placeIn(coarse, nineArrays.x, i, j)] = below.x[c] as number
    })
    if (level.down) correct(level, level.down, below)
    smooth(level, true)
    if (grid.way.along) k.correctAlong(at, size, stride, half, ...to, way.natural, 0, rows)
    else k.correctBoth(at, size, stride, half, ...to, way.natural, way.apart, 0, coarse.rows)
    k.relax(at, size, stride, half, 1, rows, 1)
    k.relax(at, size, stride, half, 0, rows, 1)
    expect(apart(machine, grid, nineArrays.x, level, level.x)).toBeLessThan(1e-5)
  })

  it('multiply, rest and step on red cells as the plain twin does with black ones eliminated', () => {
    const { machine, plan, levels } = both(...given)
    const { kernels: k, doubles, floats } = machine
    const [level, below] = levels as [Level, Level]
    const [grid] = plan.grids as [Grid]
    const alone = { index: 0, count: 1, meet: () => {} }
    const cycle = cycleOf(plan, k, doubles, alone)
    const next = numbersFrom(4)
    const isRed = (i: number, j: number) => ((i + j) & 1) === 0
    const zero = new Float64Array(level.x.length)
    // p and q = A p: black values follow from red ones, and leave red rows alone with a residual.
    eachCell(level, (i, j, c) => {
      level.x[c] = isRed(i, j) ? Math.fround(next() - 0.5) : 0
      if (isRed(i, j)) floats[placeInColours(plan, singleArrays.z, i, j)] = level.x[c] as number
    })
    relaxBlack(level)
    residual(level, level.x, zero, level.r)
    const pq = cycle.product(0)
    let product = 0
    eachCell(level, (i, j, c) => {
      if (!isRed(i, j)) return
      product -= (level.x[c] as number) * (level.r[c] as number)
      const q = doubles[doublePlace(plan, doubleArrays.q, i, j)] as number
      expect(Math.abs(q + (level.r[c] as number))).toBeLessThan(1e-12 * largest(level.r))
    })
    expect(Math.abs(pq - product)).toBeLessThan(1e-11 * Math.abs(product))
    // The way down from a residual r on red cells: x = r / D, black cells, what is left, restricted.
    eachCell(level, (i, j, c) => {
      level.b[c] = isRed(i, j) ? next() - 0.5 : 0
      if (isRed(i, j)) doubles[doublePlace(plan, doubleArrays.q, i, j)] = level.b[c] as number
      doubles[doublePlace(plan, isRed(i, j) ? doubleArrays.redX : doubleArrays.blackOwn, i, j)] = 0
    })
    const rr = cycle.trueResidual(1)
    expect(rr).toBeCloseTo(
      level.b.reduce((sum, value) => sum + value * value, 0),
      9,
    )
    cycle.descend()
    level.x.fill(0)
    smooth(level, false)
    residual(level, level.x, level.b, level.r)
    if (level.down) restrict(level, level.down, below)
    expect(apart(machine, grid, nineArrays.b, below, below.b)).toBeLessThan(1e-5)
  })
})

/** x of black cells from red ones: the second half of a forward sweep without a right-hand side. */
function relaxBlack(level: Level): void {
  const { stride: s, east, north, inverse, x } = level
  eachCell(level, (i, j, c) => {
    if (((i + j) & 1) === 0) return
    const around =
      (east[c] as number) * (x[c + 1] as number) +
      (east[c - 1] as number) * (x[c - 1] as number) +
      (north[c] as number) * (x[c + s] as number) +
      (north[c - s] as number) * (x[c - s] as number)
    x[c] = around * (inverse[c] as number)
  })
}
