import { describe, expect, it } from 'vitest'
import type { Boundary, Model, Position } from './model'
import { ModelError } from './model-error'
import { type Solution, solveModel } from './solve'

/** Sand 20 m long and 10 m high with a free surface, in metres and days; `changes` replace its fields. */
function section(changes: Partial<Model> = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'section',
    flow: 'free surface',
    extent: { x: [0, 20], y: [0, 10] },
    grid: { columns: 20, rows: 20 },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 2, ky: 2 }],
    ground: [{ material: 'Sand' }],
    ...changes,
  }
}

const side = (x: number, from = 0, to = 10): Position[] => [
  [x, from],
  [x, to],
]
const water = (name: string, x: number, head: number): Boundary => ({
  name,
  kind: 'fixed head',
  line: side(x),
  head,
})

function solved(model: Model): Solution {
  const solution = solveModel(model)
  expect(solution.result.converged).toBe(true)
  for (const percent of solution.result.balance.errorPercent) expect(Math.abs(percent)).toBeLessThan(1e-5)
  return solution
}

function refusal(changes: Partial<Model>): { path: string; message: string } {
  try {
    solveModel(section(changes))
  } catch (error) {
    if (error instanceof ModelError) return { path: error.path, message: error.message }
    throw error
  }
  throw new Error('the model was not refused')
}

describe('what a vertical section cannot mean is refused, with its path', () => {
  it.each<[string, Partial<Model>, string]>([
    ['confined flow in a section', { flow: 'confined' }, 'flow'],
    ['a free surface in plan', { kind: 'plan' }, 'flow'],
    ['a base', { ground: [{ material: 'Sand', base: 0 }] }, 'ground[0].base'],
    ['a top', { ground: [{ material: 'Sand', top: 10 }] }, 'ground[0].top'],
    ['layers', { ground: [{ layers: [{ material: 'Sand', base: 0, top: 1 }] }] }, 'ground[0].layers'],
    ['leakage', { leakage: [{ name: 'Clay', head: 3, leakance: 1 }] }, 'leakage[0]'],
    [
      'a seepage face over an area',
      { boundaries: [{ name: 'Face', kind: 'seepage face', polygon: [...side(3), ...side(5)] }] },
      'boundaries[0].polygon',
    ],
    [
      'a seepage face inside the ground',
      { boundaries: [water('West', 0, 5), { name: 'Face', kind: 'seepage face', line: side(9.7) }] },
      'boundaries[1].line',
    ],
    [
      'directions oblique to the grid above a free surface',
      { materials: [{ name: 'Sand', kx: 2, ky: 1, angle: 20 }], boundaries: [water('West', 0, 5)] },
      'materials[0].angle',
    ],
    [
      'water taken away as recharge',
      { recharge: [{ name: 'Trees', rate: -0.001 }], boundaries: [water('West', 0, 5)] },
      'recharge[0].rate',
    ],
    [
      'storage without a yield',
      {
        time: { kind: 'transient', initialHead: 5, stages: [{ duration: 1 }] },
        boundaries: [water('West', 0, 5)],
      },
      'materials[0].specificYield',
    ],
  ])('%s', (_, changes, path) => {
    expect(refusal(changes).path).toBe(path)
  })

  it('a seepage face in plan', () => {
    expect(() =>
      solveModel(
        section({
          kind: 'plan',
          flow: 'confined',
          boundaries: [{ name: 'Face', kind: 'seepage face', line: side(0) }],
        }),
      ),
    ).toThrow(/vertical section/)
  })
})

describe('water at rest', () => {
  it.each([5, 5.1, 5.25, 5.4, 7.77])('stands level at %d m, its surface to the millimetre', (level) => {
    const { result, heads } = solved(
      section({
        boundaries: [water('West', 0, level), water('East', 20, level)],
        points: [
          { name: 'below', x: 7.3, y: level - 0.01 },
          { name: 'above', x: 7.3, y: level + 0.01 },
        ],
      }),
    )
    for (const head of heads) if (!Number.isNaN(head)) expect(head).toBeCloseTo(level, 8)
    for (const { elevation } of result.freeSurface ?? []) expect(elevation).toBeCloseTo(level, 3)
    expect(result.freeSurface).toHaveLength(20)
    expect(result.points[0]?.head[0]).toBeCloseTo(level, 3)
    expect(result.points[1]).toEqual({ name: 'above', head: [null], why: 'above the water table' })
    expect(result.warnings.map(({ code }) => code)).toContain('no-capillarity')
  })
})

describe('recharge', () => {
  it('falls through dry ground to the water below it, and all of it arrives', () => {
    const { result } = solved(
      section({
        boundaries: [water('West', 0, 3), water('East', 20, 3)],
        recharge: [
          { name: 'Rain', rate: 0.001 },
          { name: 'Basin', polygon: [...side(8.3, 2, 3), ...side(11.8, 3, 2)], rate: 0.01 },
        ],
        lines: [
          {
            name: 'Through the dry ground',
            line: [
              [0, 8],
              [20, 8],
            ],
          },
        ],
      }),
    )
    const brought = 0.001 * 20 + 0.01 * 3.5
    expect(result.balance.inflow[0]).toBeCloseTo(brought, 9)
    // Down, to the right of a line that runs east.
    expect(result.lines[0]?.discharge[0]).toBeCloseTo(-brought, 9)
    const [west, middle] = [result.freeSurface?.[0], result.freeSurface?.[10]]
    expect(middle?.elevation).toBeGreaterThan((west?.elevation ?? Number.NaN) + 0.02)
  })

  it('mounds to the elliptic surface of Dupuit between two ditches where flow is nearly level', () => {
    const [length, rate, k, level] = [200, 0.002, 2, 6]
    const { result } = solved(
      section({
        extent: { x: [0, length], y: [0, 10] },
        grid: { columns: 100, rows: 40 },
        boundaries: [
          { name: 'West', kind: 'fixed head', line: side(0), head: level },
          { name: 'East', kind: 'fixed head', line: side(length), head: level },
        ],
        recharge: [{ name: 'Rain', rate }],
        // The residual is relative to the weight of the water too, which is far more than flows where it is so level.
        solver: { tolerance: 1e-11 },
      }),
    )
    const middle = result.freeSurface?.[49]
    const x = middle?.x ?? Number.NaN
    const dupuit = Math.sqrt(level ** 2 + (rate / k) * x * (length - x))
    expect(Math.abs((middle?.elevation ?? 0) - dupuit)).toBeLessThan(0.02)
  })

  it('stands on a clay lens above the water table and runs over its edge', () => {
    const { result, heads, grid } = solved(
      section({
        materials: [
          { name: 'Sand', kx: 2, ky: 2 },
          { name: 'Clay', kx: 1e-4, ky: 1e-4 },
        ],
        ground: [{ material: 'Sand' }, { material: 'Clay', polygon: [...side(6, 6, 7), ...side(14, 7, 6)] }],
        boundaries: [water('West', 0, 2), water('East', 20, 2)],
        recharge: [{ name: 'Rain', rate: 0.01 }],
        points: [
          { name: 'on the lens', x: 10, y: 7.01 },
          { name: 'under the lens', x: 10, y: 4.5 },
        ],
      }),
    )
    expect(result.points[0]?.head[0]).toBeGreaterThan(7.02)
    expect(result.points[1]?.why).toBe('above the water table')
    expect(Number.isNaN(heads[14 * grid.columns + 10] as number)).toBe(false)
    expect(Number.isNaN(heads[9 * grid.columns + 10] as number)).toBe(true)
  })

  it('that finds no outlet raises the head above the ground, and the result says so', () => {
    const { result } = solved(
      section({ boundaries: [water('West', 0, 3)], recharge: [{ name: 'Rain', rate: 3 }] }),
    )
    expect(result.warnings.map(({ code }) => code)).toContain('head-above-ground')
  })
})

describe('boundaries of a section with a free surface', () => {
  it('a fixed head acts below its level only: no water enters through the bank above it', () => {
    const whole = solved(section({ boundaries: [water('West', 0, 6), water('East', 20, 3)] }))
    const cut = solved(
      section({
        boundaries: [
          { ...water('West', 0, 6), line: side(0, 0, 6) },
          { ...water('East', 20, 3), line: side(20, 0, 3) },
        ],
      }),
    )
    expect(cut.result.balance.inflow[0]).toBeCloseTo(whole.result.balance.inflow[0] as number, 9)
  })

  it('a level inside a cell counts for the part of its face under water', () => {
    // Rows of half a metre, so that both levels cut a face: within half a percent of k (H² - t²) / 2L all the same.
    const { result } = solved(
      section({
        boundaries: [
          water('West', 0, 7.2),
          { ...water('East', 20, 2.8), line: side(20, 0, 2.8) },
          { name: 'Face', kind: 'seepage face', line: side(20, 2.8, 10) },
        ],
      }),
    )
    const exact = (2 * (7.2 ** 2 - 2.8 ** 2)) / 40
    expect(Math.abs((result.balance.inflow[0] as number) / exact - 1)).toBeLessThan(5e-3)
  })

  it('a pond on dry ground loses its water downwards', () => {
    const { result } = solved(
      section({
        boundaries: [
          water('West', 0, 2),
          water('East', 20, 2),
          {
            name: 'Pond',
            kind: 'fixed head',
            line: [
              [8, 10],
              [12, 10],
            ],
            head: 10.5,
          },
        ],
      }),
    )
    const pond = result.boundaries.find(({ name }) => name === 'Pond')
    // At least what falls under a gradient of one; more as it spreads.
    expect(pond?.inflow[0]).toBeGreaterThan(2 * 4)
    expect(pond?.outflow[0]).toBe(0)
  })

  it('a drain draws the surface down to its level and gives no water itself', () => {
    const drain: Boundary = {
      name: 'Drain',
      kind: 'drain',
      line: side(10.25, 3, 3.5),
      level: 3.25,
      conductance: 200,
    }
    const { result } = solved(section({ boundaries: [water('West', 0, 6), water('East', 20, 6), drain] }))
    const flow = result.boundaries.find(({ name }) => name === 'Drain')
    expect(flow?.inflow[0]).toBe(0)
    expect(flow?.outflow[0]).toBeGreaterThan(1)
    const lowest = Math.min(...(result.freeSurface ?? []).map(({ elevation }) => elevation))
    expect(lowest).toBeGreaterThan(3.2)
    expect(lowest).toBeLessThan(4)
    const still = solved(section({ boundaries: [water('West', 0, 3), water('East', 20, 3), drain] }))
    expect(still.result.boundaries.find(({ name }) => name === 'Drain')?.outflow[0]).toBe(0)
  })

  it('a river loses water through its bed to a deep water table at the rate where it disconnects', () => {
    const river: Boundary = {
      name: 'River',
      kind: 'head-dependent flux',
      line: [
        [9, 10],
        [11, 10],
      ],
      head: 10.5,
      conductance: 0.1,
      disconnectsBelow: 10,
    }
    const { result } = solved(section({ boundaries: [water('West', 0, 2), water('East', 20, 2), river] }))
    expect(result.boundaries.find(({ name }) => name === 'River')?.inflow[0]).toBeCloseTo(0.1 * 2 * 0.5, 6)
  })

  it('a tight wall to the base holds the water back', () => {
    const { result } = solved(
      section({
        boundaries: [water('West', 0, 8), water('East', 20, 3)],
        walls: [{ name: 'Cut-off', line: side(10), thickness: 0.5, k: 0 }],
      }),
    )
    const surface = result.freeSurface ?? []
    expect(surface[9]?.elevation).toBeCloseTo(8, 3)
    expect(surface[10]?.elevation).toBeCloseTo(3, 3)
    expect(result.balance.inflow[0]).toBeLessThan(1e-9)
  })

  it('a dug hole in the ground lets water seep from its floor and sides', () => {
    const ground: Position[] = [
      [0, 0],
      [20, 0],
      [20, 10],
      [13, 10],
      [13, 4],
      [7, 4],
      [7, 10],
      [0, 10],
    ]
    const { result } = solved(
      section({
        ground: [{ material: 'Sand', polygon: ground }],
        boundaries: [
          water('West', 0, 8),
          water('East', 20, 8),
          {
            name: 'Dig',
            kind: 'seepage face',
            line: [
              [7, 10],
              [7, 4],
              [13, 4],
              [13, 10],
            ],
          },
        ],
      }),
    )
    const [dig] = result.seepageFaces ?? []
    expect(dig?.exitElevation).toBeGreaterThan(4)
    expect(dig?.exitElevation).toBeLessThan(7)
    const [floor] = result.gradients ?? []
    expect(floor?.name).toBe('Dig')
    expect(floor?.singular).toBe(true)
    expect(result.balance.outflow[0]).toBeCloseTo(result.balance.inflow[0] as number, 6)
  })
})

describe('wells of a section', () => {
  it('one that asks for more than its ground has gives what reaches it, and says so', () => {
    const { result } = solved(
      section({
        boundaries: [water('West', 0, 6), water('East', 20, 6)],
        wells: [{ name: 'W', x: 10, y: 2.25, kind: 'abstraction', rate: 1000 }],
      }),
    )
    const [well] = result.wells
    expect(well?.achieved[0]).toBeGreaterThan(1)
    expect(well?.achieved[0]).toBeLessThan(50)
    expect(result.warnings.map(({ code }) => code)).toContain('well-reduced')
  })

  it('its lowest level is kept, at the well face', () => {
    const { result } = solved(
      section({
        boundaries: [water('West', 0, 6), water('East', 20, 6)],
        wells: [
          { name: 'W', x: 10.5, y: 2.25, kind: 'abstraction', rate: 1000, radius: 0.05, lowestLevel: 4 },
        ],
      }),
    )
    expect(result.wells[0]?.wellHead[0]).toBeCloseTo(4, 6)
  })
})

describe('a free surface that moves', () => {
  it('water that drains from a bank is what its surface gives up, and it ends at the steady state', () => {
    const sand = [{ name: 'Sand', kx: 2, ky: 2, specificYield: 0.2, specificStorage: 1e-4 }]
    const boundaries = [water('West', 0, 3), water('East', 20, 3)]
    const { result } = solved(
      section({
        materials: sand,
        boundaries,
        time: { kind: 'transient', initialHead: 7, stages: [{ duration: 2 }, { duration: 2000 }] },
      }),
    )
    const { volumes, storage } = result.balance
    const given = (volumes?.storage ?? []).reduce((sum, volume) => sum + volume, 0)
    expect(given).toBeLessThan(-0.2 * 4 * 20 * 0.95)
    expect(given).toBeGreaterThan(-0.2 * 4.5 * 20 * 1.05)
    expect(storage[0]).toBeLessThan(-0.01)
    for (const { elevation } of result.freeSurface ?? []) expect(elevation).toBeCloseTo(3, 2)
  })
})
