import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { describe, expect, it } from 'vitest'
import { instantiateKernels } from './kernels'
import { prepareMultigrid } from './multigrid'
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

interface Making {
  columns: number
  rows: number
  /** Conductivity along x and y of cell (i, j). */
  kx: (i: number, j: number) => number
  ky?: (i: number, j: number) => number
  /** Share of the cells without ground. */
  gaps?: number
  own: (i: number, j: number) => number
  /** Cell widths and heights. */
  dx?: (i: number) => number
  dy?: (j: number) => number
  corners?: (i: number, j: number) => number
}

function made(given: Making, seed = 1): { system: LinearSystem; b: Float64Array } {
  const next = numbersFrom(seed)
  const { columns, rows, kx, own } = given
  const ky = given.ky ?? kx
  const dx = given.dx ?? (() => 1)
  const dy = given.dy ?? (() => 1)
  const n = columns * rows
  const east = new Float64Array(n)
  const north = new Float64Array(n)
  const northEast = given.corners ? new Float64Array(n) : null
  const northWest = given.corners ? new Float64Array(n) : null
  const held = new Float64Array(n)
  const b = new Float64Array(n)
  const gone = Array.from({ length: n }, () => next() < (given.gaps ?? 0))
  const both = (a: number, c: number, width: number, lengthA: number, lengthC: number) =>
    (2 * width) / (lengthA / a + lengthC / c)
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const c = j * columns + i
      if (gone[c]) continue
      if (i < columns - 1 && !gone[c + 1]) east[c] = both(kx(i, j), kx(i + 1, j), dy(j), dx(i), dx(i + 1))
      if (j < rows - 1 && !gone[c + columns]) north[c] = both(ky(i, j), ky(i, j + 1), dx(i), dy(j), dy(j + 1))
      held[c] = own(i, j)
      b[c] = next() - 0.5
    }
  }
  if (given.corners && northEast && northWest) {
    for (let j = 0; j < rows - 1; j++) {
      for (let i = 0; i < columns - 1; i++) {
        const c = j * columns + i
        if (gone[c] || gone[c + 1] || gone[c + columns] || gone[c + columns + 1]) continue
        northEast[c] = given.corners(i, j)
        northWest[c + 1] = -given.corners(i, j)
      }
    }
  }
  return { system: { columns, rows, east, north, northEast, northWest, own: held }, b }
}

/** Slow twin: the dense matrix by Cholesky in double precision, refined by residuals in difference form. */
function directly(system: LinearSystem, b: Float64Array): Float64Array {
  const n = b.length
  const a = Array.from({ length: n }, () => new Float64Array(n))
  const add = (row: number, column: number, value: number) => {
    const line = a[row] as Float64Array
    line[column] = (line[column] as number) + value
  }
  eachLink(system, (c, o, link) => {
    add(c, c, link)
    add(o, o, link)
    add(c, o, -link)
    add(o, c, -link)
  })
  for (let c = 0; c < n; c++) add(c, c, system.own[c] as number)
  const dead = a.map((line, c) => line[c] === 0)
  for (let k = 0; k < n; k++) {
    const lk = a[k] as Float64Array
    for (let m = 0; m < k; m++) lk[k] = (lk[k] as number) - (lk[m] as number) ** 2
    lk[k] = dead[k] ? 1 : Math.sqrt(lk[k] as number)
    for (let i = k + 1; i < n; i++) {
      const li = a[i] as Float64Array
      let value = li[k] as number
      for (let m = 0; m < k; m++) value -= (li[m] as number) * (lk[m] as number)
      li[k] = value / (lk[k] as number)
    }
  }
  const x = new Float64Array(n)
  for (let round = 0; round < 4; round++) {
    const y = residualOf(system, x, b)
    for (let i = 0; i < n; i++) {
      const line = a[i] as Float64Array
      let value = dead[i] ? 0 : (y[i] as number)
      for (let m = 0; m < i; m++) value -= (line[m] as number) * (y[m] as number)
      y[i] = value / (line[i] as number)
    }
    for (let i = n - 1; i >= 0; i--) {
      let value = y[i] as number
      for (let m = i + 1; m < n; m++) value -= ((a[m] as Float64Array)[i] as number) * (y[m] as number)
      y[i] = value / ((a[i] as Float64Array)[i] as number)
      x[i] = (x[i] as number) + (y[i] as number)
    }
  }
  return x
}

function eachLink(
  { columns, east, north, northEast, northWest }: LinearSystem,
  visit: (c: number, o: number, link: number) => void,
) {
  for (let c = 0; c < east.length; c++) {
    if (east[c]) visit(c, c + 1, east[c] as number)
    if (north[c]) visit(c, c + columns, north[c] as number)
    if (northEast?.[c]) visit(c, c + columns + 1, northEast[c] as number)
    if (northWest?.[c]) visit(c, c + columns - 1, northWest[c] as number)
  }
}

function residualOf(system: LinearSystem, x: Float64Array, b: Float64Array): Float64Array {
  const r = b.map((value, c) => value - (system.own[c] as number) * (x[c] as number))
  eachLink(system, (c, o, link) => {
    const flow = link * ((x[c] as number) - (x[o] as number))
    r[c] = (r[c] as number) - flow
    r[o] = (r[o] as number) + flow
  })
  return r
}

function norm(values: Float64Array): number {
  return Math.sqrt(values.reduce((sum, value) => sum + value * value, 0))
}

const random = numbersFrom(5)
const rough = Array.from({ length: 10_000 }, () => random())
const field = (contrast: number) => (i: number, j: number) =>
  contrast ** ((rough[(j * 61 + i) % 10_000] as number) - 0.5)
const walled = (i: number, j: number) =>
  (i === 6 && j > 3 && j < 20) || (i === 17 && j > 3 && j < 20) || ((j === 4 || j === 19) && i > 5 && i < 18)
    ? 1e-6
    : field(100)(i, j)
const segment = (i: number, j: number) => (i === 0 && j >= 8 && j < 11 ? 2 : 0)

const problems: [string, Making][] = [
  ['one material held on one side', { columns: 23, rows: 26, kx: () => 1, own: (i) => (i === 0 ? 2 : 0) }],
  ['conductivities apart by 10^12', { columns: 24, rows: 21, kx: field(1e12), own: segment }],
  ['a wall of 1e-6 around a zone', { columns: 27, rows: 24, kx: walled, own: segment }],
  [
    'a wall around a zone in ground ten times as conductive along x',
    { columns: 27, rows: 24, kx: walled, ky: (i, j) => 0.1 * walled(i, j), own: segment },
  ],
  [
    'ground a thousand times as conductive along x',
    { columns: 25, rows: 22, kx: field(50), ky: (i, j) => 1e-3 * field(50)(i, j), own: segment },
  ],
  [
    'ground a thousand times as conductive along y',
    { columns: 25, rows: 22, kx: field(50), ky: (i, j) => 1e3 * field(50)(i, j), own: segment },
  ],
  [
    'a grid refined at one place',
    {
      columns: 25,
      rows: 25,
      kx: field(50),
      own: segment,
      dx: (i) => 1.4 ** Math.abs(i - 9),
      dy: (j) => 1.4 ** Math.abs(j - 14),
    },
  ],
  ['cells without ground', { columns: 26, rows: 22, kx: field(100), gaps: 0.2, own: () => 1e-3 }],
  ['leakage everywhere', { columns: 20, rows: 20, kx: field(1e4), own: field(1e4) }],
  [
    'cells held much faster than they are linked',
    { columns: 24, rows: 24, kx: field(10), own: (i, j) => ((i * 7 + j * 3) % 11 === 0 ? 1e9 : 0) },
  ],
  ['one row', { columns: 150, rows: 1, kx: field(1e3), own: (i) => (i === 149 ? 1 : 0) }],
  ['one column', { columns: 1, rows: 131, kx: field(1e3), own: (_, j) => (j === 3 ? 1 : 0) }],
  ['two rows', { columns: 90, rows: 2, kx: field(1e3), own: (i) => (i === 0 ? 1 : 0) }],
  ['one cell', { columns: 1, rows: 1, kx: () => 1, own: () => 3 }],
  ['links to corners', { columns: 25, rows: 22, kx: () => 2, own: segment, corners: () => 0.7 }],
]

for (const [arithmetic, means] of [
  ['compiled', kernels],
  ['in TypeScript', undefined],
] as const) {
  describe(`multigrid, ${arithmetic}`, () => {
    it.each(problems)('solves %s as the dense factor does', (_, making) => {
      const { system, b } = made(making)
      const exact = directly(system, b)
      const x = new Float64Array(b.length)
      const outcome = prepareMultigrid(system, means).solve(b, x, {
        target: 1e-13 * norm(b),
        mostIterations: 200,
      })
      expect(outcome.ended).toMatch(/converged|stalled/)
      expect(outcome.residual).toBeLessThanOrEqual(Math.max(2 * norm(residualOf(system, x, b)), 1e-300))
      const largest = exact.reduce((most, value) => Math.max(most, Math.abs(value)), 0)
      const apart = exact.reduce((most, value, c) => Math.max(most, Math.abs(value - (x[c] as number))), 0)
      expect(apart / largest).toBeLessThan(1e-10)
    })
  })
}
