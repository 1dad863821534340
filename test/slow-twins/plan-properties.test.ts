import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import type { Model, Position } from '~/solver/model'
import { type Solution, solveModel } from '~/solver/solve'
import { east, planModel, west } from './plan-model'

const inside = fc.double({ min: 6, max: 94, noNaN: true })
const rate = fc.double({ min: 0.1, max: 60, noNaN: true })
const runs = { numRuns: 12 }

function well(x: number, y: number, amount: number, name = 'W') {
  return { name, x, y, kind: 'abstraction' as const, rate: amount }
}

function solved(model: Model): Solution {
  const solution = solveModel(model)
  expect(solution.result.converged).toBe(true)
  return solution
}

function largestDifference(a: ArrayLike<number>, b: ArrayLike<number>): number {
  let largest = 0
  for (let k = 0; k < a.length; k++)
    largest = Math.max(largest, Math.abs((a[k] as number) - (b[k] as number)))
  return largest
}

function cellHead({ result }: Solution, name: string): number {
  return result.wells.find((entry) => entry.name === name)?.cellHead[0] as number
}

const lens = {
  materials: [
    { name: 'Sand', kx: 5, ky: 2 },
    { name: 'Gravel', kx: 400, ky: 400 },
  ],
  ground: [
    { material: 'Sand', base: 0, top: 10 },
    {
      material: 'Gravel',
      polygon: [
        [20, 30],
        [70, 20],
        [60, 80],
      ] as Position[],
      base: 0,
      top: 10,
    },
  ],
}

describe('plan flow', () => {
  it('closes its balance, of the whole and of any ring', () => {
    fc.assert(
      fc.property(inside, inside, rate, fc.boolean(), inside, (x, y, amount, unconfined, corner) => {
        const { result } = solved(
          planModel({
            ...(unconfined ? { flow: 'unconfined', ground: [{ material: 'Sand', base: 0 }] } : lens),
            wells: [well(x, y, amount)],
            recharge: [{ name: 'Rain', rate: 0.002 }],
            rings: [
              {
                name: 'Ring',
                polygon: [
                  [3, 3],
                  [corner, 5],
                  [97, 97],
                  [2, 90],
                ],
              },
            ],
          }),
        )
        const inflow = result.balance.inflow[0] as number
        expect(Math.abs(result.balance.errorPercent[0] as number)).toBeLessThan(1e-5)
        expect(Math.abs(result.rings[0]?.error[0] as number)).toBeLessThan(1e-7 * inflow)
      }),
      runs,
    )
  })

  it('superposes: the drawdown of two wells is the sum of the drawdowns of each', () => {
    fc.assert(
      fc.property(inside, inside, rate, inside, inside, rate, (x1, y1, q1, x2, y2, q2) => {
        const heads = (wells: ReturnType<typeof well>[]) => solved(planModel({ ...lens, wells })).heads
        const none = heads([])
        const first = heads([well(x1, y1, q1)])
        const second = heads([well(x2, y2, q2)])
        const both = heads([well(x1, y1, q1), well(x2, y2, q2, 'V')])
        const sum = both.map((_, c) => (first[c] as number) + (second[c] as number) - (none[c] as number))
        expect(largestDifference(both, sum)).toBeLessThan(1e-7)
      }),
      runs,
    )
  })

  it('is reciprocal: pumping at A lowers B as much as pumping at B lowers A', () => {
    fc.assert(
      fc.property(inside, inside, inside, inside, rate, (xa, ya, xb, yb, amount) => {
        const both = (qa: number, qb: number) =>
          solved(planModel({ ...lens, wells: [well(xa, ya, qa, 'A'), well(xb, yb, qb, 'B')] }))
        const none = both(0, 0)
        const lowersB = cellHead(none, 'B') - cellHead(both(amount, 0), 'B')
        const lowersA = cellHead(none, 'A') - cellHead(both(0, amount), 'A')
        expect(Math.abs(lowersA - lowersB)).toBeLessThan(1e-7)
      }),
      runs,
    )
  })

  it('keeps every head between those of its boundaries where nothing is added or taken', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -50, max: 50, noNaN: true }),
        inside,
        inside,
        fc.boolean(),
        (level, x, y, tight) => {
          const { heads } = solved(
            planModel({
              ...lens,
              boundaries: [west(12), east(level)],
              walls: [
                {
                  name: 'Wall',
                  line: [
                    [x, 0],
                    [y, 80],
                  ],
                  thickness: 1,
                  k: tight ? 0 : 1e-4,
                },
              ],
            }),
          )
          expect(Math.min(...heads)).toBeGreaterThanOrEqual(Math.min(12, level) - 1e-8)
          expect(Math.max(...heads)).toBeLessThanOrEqual(Math.max(12, level) + 1e-8)
        },
      ),
      runs,
    )
  })

  it('mirrors: a mirrored site has mirrored heads', () => {
    fc.assert(
      fc.property(inside, inside, rate, inside, (x, y, amount, end) => {
        const here = solved(
          planModel({
            wells: [well(x, y, amount)],
            walls: [
              {
                name: 'Wall',
                line: [
                  [31, 0],
                  [end, 63],
                ],
                thickness: 1,
                k: 1e-3,
              },
            ],
          }),
        ).heads
        const there = solved(
          planModel({
            boundaries: [west(11), east(12)],
            wells: [well(100 - x, y, amount)],
            walls: [
              {
                name: 'Wall',
                line: [
                  [69, 0],
                  [100 - end, 63],
                ],
                thickness: 1,
                k: 1e-3,
              },
            ],
          }),
        ).heads
        const mirrored = here.map((_, c) => there[c - (c % 20) + 19 - (c % 20)] as number)
        expect(largestDifference(here, mirrored)).toBeLessThan(1e-7)
      }),
      runs,
    )
  })

  it('knows no datum: a thousand metres on every level move every head by a thousand and nothing else', () => {
    fc.assert(
      fc.property(inside, inside, rate, fc.boolean(), (x, y, amount, unconfined) => {
        const at = (datum: number) =>
          solved(
            planModel({
              flow: unconfined ? 'unconfined' : 'confined',
              ground: [{ material: 'Sand', base: datum, top: datum + 11.5 }],
              boundaries: [
                west(12 + datum),
                {
                  name: 'River',
                  kind: 'head-dependent flux',
                  line: [
                    [80, 0],
                    [90, 100],
                  ],
                  head: 11 + datum,
                  conductance: 0.2,
                  disconnectsBelow: 10 + datum,
                },
                {
                  name: 'Ditch',
                  kind: 'drain',
                  line: [
                    [40, 20],
                    [40, 80],
                  ],
                  level: 11.8 + datum,
                  conductance: 0.1,
                },
              ],
              wells: [{ ...well(x, y, amount), lowestLevel: 3 + datum }],
            }),
          )
        const low = at(0)
        const high = at(1000)
        expect(
          largestDifference(
            low.heads.map((head) => head + 1000),
            high.heads,
          ),
        ).toBeLessThan(1e-6)
        expect(high.result.iterations).toBeLessThanOrEqual(1.2 * low.result.iterations + 60)
        expect(high.result.wells[0]?.achieved[0]).toBeCloseTo(low.result.wells[0]?.achieved[0] as number, 5)
      }),
      runs,
    )
  })

  it('knows no unit: the same site in feet and seconds has the same heads', () => {
    fc.assert(
      fc.property(inside, inside, rate, (x, y, amount) => {
        const foot = 0.3048
        const day = 86400
        const inUnits = (length: number, time: number) =>
          solved(
            planModel({
              units: length === 1 ? { length: 'm', time: 'd' } : { length: 'ft', time: 's' },
              extent: { x: [0, 100 / length], y: [0, 100 / length] },
              materials: [{ name: 'Sand', kx: (5 / length) * time, ky: (5 / length) * time }],
              ground: [{ material: 'Sand', base: 0, top: 10 / length }],
              boundaries: [
                {
                  name: 'West',
                  kind: 'fixed head',
                  line: [
                    [0, 0],
                    [0, 100 / length],
                  ],
                  head: 12 / length,
                },
                {
                  name: 'East',
                  kind: 'specified flux',
                  line: [
                    [100 / length, 0],
                    [100 / length, 100 / length],
                  ],
                  flux: (0.01 / length ** 2) * time,
                },
              ],
              recharge: [{ name: 'Rain', rate: (0.001 / length) * time }],
              wells: [well(x / length, y / length, (amount / length ** 3) * time)],
            }),
          )
        const metric = inUnits(1, 1)
        const imperial = inUnits(foot, 1 / day)
        expect(
          largestDifference(
            metric.heads,
            imperial.heads.map((head) => head * foot),
          ),
        ).toBeLessThan(1e-7)
      }),
      runs,
    )
  })

  it('converges with the square of the cell size to a made-up solution on uneven grids', () => {
    // h = sin(x) cosh(y) + cos(2x) has Laplacian -4 cos(2x): recharge given cell by cell, heads given on the edge.
    const exact = (x: number, y: number) => Math.sin(x) * Math.cosh(y) + Math.cos(2 * x)
    const error = (n: number): number => {
      const edges = Array.from({ length: n + 1 }, (_, k) => {
        const t = k / n
        return t + (0.25 * Math.sin(2 * Math.PI * t)) / (2 * Math.PI)
      })
      edges[0] = 0
      edges[n] = 1
      const along = (from: Position, to: Position) => {
        const line = Array.from(
          { length: 201 },
          (_, k): Position => [
            from[0] + ((to[0] - from[0]) * k) / 200,
            from[1] + ((to[1] - from[1]) * k) / 200,
          ],
        )
        return { line, head: line.map(([x, y]) => exact(x, y)) }
      }
      const recharge = edges.slice(0, -1).map((from, k) => {
        const to = edges[k + 1] as number
        // Exact mean of 4 cos(2x) over the column.
        const mean = (2 * (Math.sin(2 * to) - Math.sin(2 * from))) / (to - from)
        return {
          name: `Column ${k}`,
          polygon: [
            [from, 0],
            [to, 0],
            [to, 1],
            [from, 1],
          ] as Position[],
          rate: mean,
        }
      })
      const { heads, grid } = solved({
        ...planModel(),
        extent: { x: [0, 1], y: [0, 1] },
        grid: { xEdges: edges, yEdges: edges },
        materials: [{ name: 'Sand', kx: 1, ky: 1 }],
        ground: [{ material: 'Sand', base: 0, top: 1 }],
        boundaries: [
          { name: 'South', kind: 'fixed head', ...along([0, 0], [1, 0]) },
          { name: 'East', kind: 'fixed head', ...along([1, 0], [1, 1]) },
          { name: 'North', kind: 'fixed head', ...along([0, 1], [1, 1]) },
          { name: 'West', kind: 'fixed head', ...along([0, 0], [0, 1]) },
        ],
        recharge,
      })
      let sum = 0
      for (let c = 0; c < heads.length; c++) {
        const i = c % n
        const j = (c - i) / n
        const [w, e] = [grid.xEdges[i] as number, grid.xEdges[i + 1] as number]
        const [s, north] = [grid.yEdges[j] as number, grid.yEdges[j + 1] as number]
        const difference = (heads[c] as number) - exact((w + e) / 2, (s + north) / 2)
        sum += difference * difference * (e - w) * (north - s)
      }
      return Math.sqrt(sum)
    }
    const [coarse, middle, fine] = [16, 32, 64].map(error) as [number, number, number]
    expect(Math.log2(coarse / middle)).toBeGreaterThan(1.85)
    expect(Math.log2(middle / fine)).toBeGreaterThan(1.85)
  })
})
