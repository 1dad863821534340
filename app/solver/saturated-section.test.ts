import { describe, expect, it } from 'vitest'
import type { Boundary, Model, Position } from './model'
import { type Solution, solveModel } from './solve'

/** Saturated sand 20 m long and 10 m high, in metres and days; `changes` replace its fields. */
function section(changes: Partial<Model> = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'section',
    flow: 'saturated',
    extent: { x: [0, 20], y: [0, 10] },
    grid: { columns: 20, rows: 20 },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 2, ky: 0.5 }],
    ground: [{ material: 'Sand' }],
    ...changes,
  }
}

const line = (...vertices: Position[]): Position[] => vertices
const held = (name: string, along: Position[], head: number | number[]): Boundary => ({
  name,
  kind: 'fixed head',
  line: along,
  head,
})

function solved(model: Model): Solution {
  const solution = solveModel(model)
  expect(solution.result.converged).toBe(true)
  for (const percent of solution.result.balance.errorPercent) expect(Math.abs(percent)).toBeLessThan(1e-5)
  return solution
}

const codes = ({ result }: Solution) => result.warnings.map(({ code }) => code)

describe('a saturated section', () => {
  it('is one metre wide: flow along it is kx x height x gradient, up it ky x length x gradient', () => {
    const along = solved(
      section({
        boundaries: [held('West', line([0, 0], [0, 10]), 12), held('East', line([20, 0], [20, 10]), 11)],
      }),
    )
    expect(along.result.balance.inflow[0]).toBeCloseTo((2 * 10 * 1) / 20, 9)
    const up = solved(
      section({
        boundaries: [held('Base', line([0, 0], [20, 0]), 12), held('Top', line([0, 10], [20, 10]), 11)],
      }),
    )
    expect(up.result.balance.inflow[0]).toBeCloseTo((0.5 * 20 * 1) / 10, 9)
  })

  it('takes recharge on the highest ground of every column, as much as lies under it', () => {
    const slope = line([0, 0], [20, 0], [20, 4], [0, 9])
    const solution = solved(
      section({
        ground: [{ material: 'Sand', polygon: slope }],
        boundaries: [held('East', line([20, 0], [20, 4]), 4)],
        recharge: [
          { name: 'Rain', rate: 0.002 },
          { name: 'Basin', polygon: line([2.5, 8], [6.25, 8], [6.25, 9], [2.5, 9]), rate: 0.01 },
          { name: 'Half beside', polygon: line([15, 0], [25, 0], [25, 1], [15, 1]), rate: 0.004 },
        ],
        rings: [{ name: 'Below', polygon: line([0, 0], [19, 0], [19, 3], [0, 3]) }],
      }),
    )
    const brought = solution.result.recharge.map(({ inflow }) => inflow[0])
    expect(brought[0]).toBeCloseTo(0.04, 12)
    expect(brought[1]).toBeCloseTo(0.0375, 12)
    expect(brought[2]).toBeCloseTo(0.02, 12)
    expect(solution.result.rings[0]?.recharge[0]).toBe(0)
    expect(codes(solution)).toContain('area-outside')
  })

  it('lets water out of a seepage face at its elevation, and none in', () => {
    const face: Boundary = { name: 'Face', kind: 'seepage face', line: line([20, 0], [20, 10]) }
    const wet = solved(section({ boundaries: [held('West', line([0, 0], [0, 10]), 14), face] }))
    const [out] = wet.result.boundaries.filter(({ name }) => name === 'Face')
    expect(out?.inflow[0]).toBe(0)
    expect(out?.outflow[0]).toBeGreaterThan(0.5)
    expect(wet.result.balance.kinds.map(({ kind }) => kind)).toContain('seepage face')
    expect(wet.result.seepageFaces?.[0]?.exitElevation).toBeGreaterThan(5)
    const dry = solved(section({ boundaries: [held('West', line([0, 0], [0, 10]), -1), face] }))
    expect(dry.result.boundaries.find(({ name }) => name === 'Face')?.inflow[0]).toBe(0)
    expect(dry.result.seepageFaces?.[0]?.exitElevation).toBeNull()
    expect(codes(dry)).toContain('negative-pressure')
  })

  it('follows a water table given by vertex along sloping ground', () => {
    const top = line([0, 9], [20, 4])
    const solution = solved(
      section({
        grid: { columns: 80, rows: 80 },
        ground: [{ material: 'Sand', polygon: line([0, 0], [20, 0], [20, 4], [0, 9]) }],
        boundaries: [held('Water table', top, [9, 4])],
        points: [
          { name: 'under the high end', x: 1, y: 1 },
          { name: 'under the low end', x: 19, y: 1 },
        ],
      }),
    )
    const [high, low] = solution.result.points.map(({ head }) => head[0] as number)
    expect(high).toBeLessThan(9)
    expect(high).toBeGreaterThan(low as number)
    expect(low).toBeGreaterThan(4)
    expect(solution.result.balance.inflow[0]).toBeGreaterThan(0.1)
  })

  it('says where gradients have no limit: at the corner of a dig, not beside its wall', () => {
    const dig = line([0, 0], [20, 0], [20, 10], [8, 10], [8, 6], [0, 6])
    const boundaries = [
      held('Ground', line([8, 10], [20, 10]), 10),
      held('Dig level', line([0, 6], [8, 6]), 6),
    ]
    const open = solved(section({ ground: [{ material: 'Sand', polygon: dig }], boundaries }))
    const walled = solved(
      section({
        ground: [{ material: 'Sand', polygon: dig }],
        boundaries,
        walls: [{ name: 'Wall', line: line([8, 3], [8, 10]), thickness: 0.3, k: 0 }],
      }),
    )
    const [corner] = open.result.gradients ?? []
    const [beside] = walled.result.gradients ?? []
    expect(corner).toMatchObject({ name: 'Dig level', singular: true, at: [7.5, 6] })
    expect(beside).toMatchObject({ name: 'Dig level', singular: false, cellSize: 0.5 })
    expect(beside?.overDepth).toBeCloseTo(3, 9)
    expect(beside?.mean).toBeLessThan(corner?.localMaximum as number)
    expect(beside?.mean).toBeGreaterThan(0.2)
    // Without a wall the mean is over a tenth of the ground's depth, or two cells.
    expect(corner?.overDepth).toBeCloseTo(1, 9)
    expect(corner?.mean).toBeLessThan(corner?.localMaximum as number)
  })

  it('gives no gradient where no water leaves upwards', () => {
    const { result } = solved(
      section({
        boundaries: [held('West', line([0, 0], [0, 10]), 12), held('East', line([20, 0], [20, 10]), 11)],
      }),
    )
    expect(result.gradients).toEqual([])
  })
})
