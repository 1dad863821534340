import { describe, expect, it } from 'vitest'
import { balancerOf } from '~/solver/balancer'
import { cornersOf } from '~/solver/corners'
import { discretise } from '~/solver/discretise'
import { faceOf } from '~/solver/faces'
import type { Boundary, Model, Position } from '~/solver/model'

/**
 * Manufactured solutions (Roache 2002, Journal of Fluids Engineering 124): a smooth head is prescribed, the recharge
 * that it needs put into every cell, and the heads computed on ever finer grids compared with it.
 */
type Field = (x: number, y: number) => number
type Side = 'west' | 'east' | 'south' | 'north'

interface Manufactured {
  kx: number
  ky: number
  angle?: number
  head: Field
  /** Of the ground, linear in x and y; unconfined ground has the head itself. */
  thickness: Field
  flow?: Model['flow']
  /** What stands on each side; nothing: no flow. */
  sides: Partial<Record<Side, 'fixed head' | 'specified flux'>>
}

const size = 100

const grids: Record<string, (n: number) => number[]> = {
  'an even grid': (n) => Array.from({ length: n + 1 }, (_, k) => (size * k) / n),
  'cells alternating 1 to 2': (n) => edgesOf(Array.from({ length: n }, (_, k) => (k % 2 === 0 ? 1 : 2))),
  'cells growing by a factor of 7.4 from end to end': (n) =>
    Array.from({ length: n + 1 }, (_, k) => (size * Math.expm1((2 * k) / n)) / Math.expm1(2)),
}

function edgesOf(widths: number[]): number[] {
  const whole = widths.reduce((sum, width) => sum + width, 0)
  let sum = 0
  return [
    0,
    ...widths.map((width) => {
      sum += width
      return (size * sum) / whole
    }),
  ]
}

const sideLines: Record<Side, Position[]> = {
  west: [
    [0, 0],
    [0, size],
  ],
  east: [
    [size, 0],
    [size, size],
  ],
  south: [
    [0, 0],
    [size, 0],
  ],
  north: [
    [0, size],
    [size, size],
  ],
}

/** Central difference of fourth order. */
function slope(f: (t: number) => number, t: number): number {
  const step = 0.02
  return (8 * (f(t + step) - f(t - step)) - (f(t + 2 * step) - f(t - 2 * step))) / (12 * step)
}

/** Mean between p and q by three points of Gauss. */
function mean(f: (t: number) => number, p: number, q: number): number {
  const [middle, half] = [(p + q) / 2, ((q - p) / 2) * Math.sqrt(0.6)]
  return (5 * f(middle - half) + 8 * f(middle) + 5 * f(middle + half)) / 18
}

/** Errors on n x n cells: heads by root mean square and at the worst, flow through faces by root mean square. */
function errorsOn(problem: Manufactured, edges: number[]): { head: number; worst: number; flux: number } {
  const { head, thickness } = problem
  const n = edges.length - 1
  const level = thickness
  const corners: Position[] = [
    [0, 0],
    [size, 0],
    [0, size],
    [size, size],
  ]
  const model: Model = {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: problem.flow === 'saturated' ? 'section' : 'plan',
    flow: problem.flow ?? 'confined',
    extent: { x: [0, size], y: [0, size] },
    grid: { xEdges: edges, yEdges: edges },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: problem.kx, ky: problem.ky, angle: problem.angle ?? 0 }],
    ground: [
      {
        material: 'Sand',
        ...(problem.flow === 'saturated' ? {} : { base: 0 }),
        ...(problem.flow
          ? {}
          : { top: { xyz: corners.map(([x, y]) => [x, y, level(x, y)] as [number, number, number]) } }),
      },
    ],
    boundaries: (Object.keys(problem.sides) as Side[]).map((side): Boundary => {
      const line = sideLines[side]
      return problem.sides[side] === 'fixed head'
        ? { name: side, kind: 'fixed head', line, head: 12 }
        : { name: side, kind: 'specified flux', line, flux: 1 }
    }),
  }
  const d = discretise(model)
  const turn = ((problem.angle ?? 0) * Math.PI) / 180
  const [c, s] = [Math.cos(turn), Math.sin(turn)]
  const kxx = problem.kx * c * c + problem.ky * s * s
  const kyy = problem.kx * s * s + problem.ky * c * c
  const kxy = (problem.kx - problem.ky) * s * c
  const thick = (x: number, y: number) => (problem.flow === 'unconfined' ? head(x, y) : thickness(x, y))
  const hx = (x: number, y: number) => slope((t) => head(t, y), x)
  const hy = (x: number, y: number) => slope((t) => head(x, t), y)
  const qx = (x: number, y: number) => -thick(x, y) * (kxx * hx(x, y) + kxy * hy(x, y))
  const qy = (x: number, y: number) => -thick(x, y) * (kxy * hx(x, y) + kyy * hy(x, y))
  const meanQx = (x: number, y0: number, y1: number) => mean((y) => qx(x, y), y0, y1)
  const meanQy = (y: number, x0: number, x1: number) => mean((x) => qy(x, y), x0, x1)
  const at = (k: number) => edges[k] as number
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) {
      const [x0, x1, y0, y1] = [at(i), at(i + 1), at(j), at(j + 1)]
      d.recharge[j * n + i] =
        (y1 - y0) * (meanQx(x1, y0, y1) - meanQx(x0, y0, y1)) +
        (x1 - x0) * (meanQy(y1, x0, x1) - meanQy(y0, x0, x1))
    }
  }
  for (const exchange of d.exchanges) {
    const [x, y] = faceOf(d.grid, exchange.face).middle
    exchange.head = head(x, y) - d.reference
  }
  for (const flow of d.specifiedFlows) {
    const { axis, low, length, middle } = faceOf(d.grid, flow.face)
    const [a, b] =
      axis === 'x'
        ? [middle[1] - length / 2, middle[1] + length / 2]
        : [middle[0] - length / 2, middle[0] + length / 2]
    const out = axis === 'x' ? meanQx(middle[0], a, b) : meanQy(middle[1], a, b)
    flow.rate = (low < 0 ? 1 : -1) * length * out
  }
  d.corners = cornersOf(d)
  const balancer = balancerOf(d, 'multigrid', 1e-11, {})
  const outcome = balancer.solve(null, null)
  expect(outcome.converged).toBe(true)
  const { atFace } = balancer.field(outcome, null)
  let [squares, worst, fluxSquares] = [0, 0, 0]
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) {
      const area = (at(i + 1) - at(i)) * (at(j + 1) - at(j))
      const exact = head((at(i) + at(i + 1)) / 2, (at(j) + at(j + 1)) / 2)
      const error = Math.abs((outcome.heads[j * n + i] as number) + d.reference - exact)
      squares += (area * error * error) / size ** 2
      worst = Math.max(worst, error)
      if (i === 0) continue
      const flux = atFace(j * (n + 1) + i) / (at(j + 1) - at(j)) - meanQx(at(i), at(j), at(j + 1))
      fluxSquares += (area * flux * flux) / size ** 2
    }
  }
  return { head: Math.sqrt(squares), worst, flux: Math.sqrt(fluxSquares) }
}

/** Observed orders between n and 2n cells a side. */
function ordersOf(problem: Manufactured, edges: (n: number) => number[], n = 24) {
  const coarse = errorsOn(problem, edges(n))
  const fine = errorsOn(problem, edges(2 * n))
  return {
    head: Math.log2(coarse.head / fine.head),
    worst: Math.log2(coarse.worst / fine.worst),
    flux: Math.log2(coarse.flux / fine.flux),
  }
}

const waves: Field = (x, y) =>
  12 + 3 * Math.sin((1.3 * Math.PI * x) / size + 0.3) * Math.cos((0.9 * Math.PI * y) / size - 0.2) + x / size
const wedge: Field = (x, y) => 10 + 0.05 * x + 0.03 * y
const even: Field = () => 10
const held = { west: 'fixed head', east: 'fixed head', south: 'fixed head', north: 'fixed head' } as const

/** Heads that let nothing through the north side although the gradient along it does not vanish. */
function closedNorth(kx: number, ky: number, degrees: number): Field {
  const [c, s] = [Math.cos((degrees * Math.PI) / 180), Math.sin((degrees * Math.PI) / 180)]
  const ratio = ((kx - ky) * s * c) / (kx * s * s + ky * c * c)
  return (x, y) =>
    12 +
    2 * Math.sin((2 * x) / size + 0.2) -
    ratio * (y - size) * (4 / size) * Math.cos((2 * x) / size + 0.2) +
    2 * ((y - size) / size) ** 2 * Math.cos(x / size)
}

const problems: Record<string, Manufactured> = {
  'confined wedge, directions along the grid': { kx: 5, ky: 2, head: waves, thickness: wedge, sides: held },
  unconfined: { kx: 5, ky: 2, head: waves, thickness: even, flow: 'unconfined', sides: held },
  'confined wedge, 10 to 1 at 30 degrees': {
    kx: 10,
    ky: 1,
    angle: 30,
    head: waves,
    thickness: wedge,
    sides: held,
  },
  'unconfined, 10 to 1 at 30 degrees': {
    kx: 10,
    ky: 1,
    angle: 30,
    head: waves,
    thickness: even,
    flow: 'unconfined',
    sides: held,
  },
  'saturated section, 100 to 1 at 60 degrees': {
    kx: 100,
    ky: 1,
    angle: 60,
    head: waves,
    thickness: () => 1,
    flow: 'saturated',
    sides: held,
  },
  '10 to 1 at 30 degrees with fluxes on two sides': {
    kx: 10,
    ky: 1,
    angle: 30,
    head: waves,
    thickness: wedge,
    sides: { ...held, south: 'specified flux', north: 'specified flux' },
  },
  '10 to 1 at 30 degrees with a side that lets nothing through': {
    kx: 10,
    ky: 1,
    angle: 30,
    head: closedNorth(10, 1, 30),
    thickness: even,
    sides: { west: 'fixed head', east: 'fixed head', south: 'fixed head' },
  },
}

describe.each(Object.entries(problems))('%s', (_, problem) => {
  it.each(Object.entries(grids))(
    'heads of second order on %s, worst cells beside the sides included; flows through faces at least of order 1.5',
    (_name, edges) => {
      const order = ordersOf(problem, edges)
      expect(order.head).toBeGreaterThan(1.85)
      expect(order.worst).toBeGreaterThan(1.6)
      expect(order.flux).toBeGreaterThan(1.5)
    },
  )
})

describe('a jump of conductivity', () => {
  it('along the grid costs no order, through the middle of cells it leaves first order', () => {
    // h = x up to x = 50, beyond it a quarter as steep: the same flow in ground four times as conductive.
    const jump = (at: number, n: number) => {
      const model: Model = {
        format: 'lavant-model',
        version: 1,
        units: { length: 'm', time: 'd' },
        kind: 'plan',
        flow: 'confined',
        extent: { x: [0, size], y: [0, size] },
        grid: { columns: n, rows: 3 },
        time: { kind: 'steady' },
        materials: [
          { name: 'Silt', kx: 1, ky: 1 },
          { name: 'Sand', kx: 4, ky: 4 },
        ],
        ground: [
          { material: 'Silt', base: 0, top: 1 },
          {
            material: 'Sand',
            polygon: [
              [at, 0],
              [size, 0],
              [size, size],
              [at, size],
            ],
            base: 0,
            top: 1,
          },
        ],
        boundaries: [
          { name: 'West', kind: 'fixed head', line: sideLines.west, head: 0 },
          { name: 'East', kind: 'fixed head', line: sideLines.east, head: at + (size - at) / 4 },
        ],
      }
      const d = discretise(model)
      const { heads } = balancerOf(d, 'multigrid', 1e-12, {}).solve(null, null)
      let worst = 0
      for (let i = 0; i < n; i++) {
        const x = ((i + 0.5) * size) / n
        const exact = x < at ? x : at + (x - at) / 4
        worst = Math.max(worst, Math.abs((heads[n + i] as number) + d.reference - exact))
      }
      return worst
    }
    expect(jump(50, 10)).toBeLessThan(1e-8)
    // A third into a cell on every one of these grids.
    const third = (n: number) => 50 + size / n / 3
    const order = Math.log2(jump(third(10), 10) / jump(third(20), 20))
    expect(order).toBeGreaterThan(0.9)
    expect(order).toBeLessThan(1.2)
  })
})
