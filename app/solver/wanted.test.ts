import { describe, expect, it } from 'vitest'
import type { Boundary, Model, Position } from './model'
import { solveModel } from './solve'

const sides: Record<string, Position[]> = {
  West: [
    [0, 0],
    [0, 400],
  ],
  East: [
    [600, 0],
    [600, 400],
  ],
}

function held(name: 'West' | 'East', head: number, outer = false): Boundary {
  return { name, kind: 'fixed head', line: sides[name], head, ...(outer ? { outer } : {}) }
}

/** A confined strip between two held sides; `changes` replace its fields. */
function strip(changes: Partial<Model> = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 600], y: [0, 400] },
    grid: { columns: 30, rows: 20 },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 8, ky: 8, porosity: 0.25 }],
    ground: [{ material: 'Sand', base: -10, top: 0 }],
    boundaries: [held('West', 12), held('East', 9)],
    ...changes,
  }
}

const well = { name: 'W1', x: 290, y: 210, kind: 'abstraction' as const, rate: 150, radius: 0.2 }

describe('flow lines', () => {
  it('travel time through even flow is length squared x porosity / (K x head difference), on any grid', () => {
    for (const grid of [
      { columns: 7, rows: 3 },
      { xEdges: [0, 10, 40, 41, 300, 310, 600], yEdges: [0, 150, 400] },
    ]) {
      const { result } = solveModel(
        strip({ grid, want: { flowLines: [{ from: [1e-9, 130], direction: 'forward' }] } }),
      )
      const [line] = result.flowLines ?? []
      expect(line?.ended).toEqual({ at: 'boundary', name: 'East' })
      expect(line?.time).toBeCloseTo((600 ** 2 * 0.25) / (8 * 3), 4)
      expect(line?.line.at(-1)?.[1]).toBeCloseTo(130, 6)
    }
  })

  it('against the flow a line takes as long and ends where the water came in', () => {
    const { result } = solveModel(
      strip({ want: { flowLines: [{ from: [600 - 1e-9, 130], direction: 'back' }] } }),
    )
    expect(result.flowLines?.[0]?.ended).toEqual({ at: 'boundary', name: 'West' })
    expect(result.flowLines?.[0]?.time).toBeCloseTo((600 ** 2 * 0.25) / (8 * 3), 4)
  })

  it('unconfined water moves through the saturated thickness', () => {
    const { result } = solveModel(
      strip({
        flow: 'unconfined',
        ground: [{ material: 'Sand', base: 0 }],
        grid: { columns: 200, rows: 3 },
        want: { flowLines: [{ from: [1e-9, 130], direction: 'forward' }] },
      }),
    )
    // Dupuit: q = K (h1^2 - h2^2) / 2L and v = q / (n h), so t = n / q x the integral of h.
    const q = (8 * (12 ** 2 - 9 ** 2)) / (2 * 600)
    const slope = (12 ** 2 - 9 ** 2) / 600
    const integral = (12 ** 3 - 9 ** 3) / (1.5 * slope)
    expect(result.flowLines?.[0]?.time).toBeCloseTo((0.25 * integral) / q, -1)
    expect(Math.abs((result.flowLines?.[0]?.time ?? 0) / ((0.25 * integral) / q) - 1)).toBeLessThan(1e-4)
  })

  it('water of recharge is traced back to it', () => {
    const { result } = solveModel(
      strip({
        boundaries: [held('West', 10), held('East', 10)],
        grid: { columns: 31, rows: 20 },
        recharge: [{ name: 'Rain', rate: 0.002 }],
        want: { flowLines: [{ from: [500, 210], direction: 'back' }] },
      }),
    )
    expect(result.flowLines?.[0]?.ended).toEqual({ at: 'recharge', name: 'Rain' })
  })

  it('a well that takes only part of the water is passed, and named', () => {
    const { result } = solveModel(
      strip({
        wells: [{ ...well, x: 290, y: 210, rate: 0.2 }],
        want: { flowLines: [{ from: [100, 208], direction: 'forward' }] },
      }),
    )
    expect(result.flowLines?.[0]?.passed).toEqual(['W1'])
    expect(result.flowLines?.[0]?.ended).toEqual({ at: 'boundary', name: 'East' })
  })
})

describe('the verification of a run', () => {
  it('gives every named result a band, by three grids', () => {
    const { result } = solveModel(
      strip({
        wells: [well],
        points: [{ name: 'P1', x: 400, y: 200 }],
        lines: [
          {
            name: 'Middle',
            line: [
              [450, 400],
              [450, 0],
            ],
          },
        ],
        rings: [
          {
            name: 'Site',
            polygon: [
              [200, 100],
              [400, 100],
              [400, 300],
              [200, 300],
            ],
          },
        ],
        want: { verify: true },
      }),
    )
    const { verification } = result
    expect(verification?.grid.grids.map(({ cells }) => cells)).toEqual([2400, 600, 150])
    expect(verification?.results.map(({ name }) => name)).toEqual([
      'points/P1',
      'wells/W1',
      'lines/Middle',
      'rings/Site/through',
    ])
    const head = result.points[0]?.head[0] as number
    const band = result.points[0]?.band?.[0]
    expect(band?.[0]).toBeLessThan(head)
    expect(band?.[1]).toBeGreaterThan(head)
    // The well between two sides of different heads is a case with a formula.
    expect(verification?.formula?.results.map(({ name }) => name)).toEqual(['points/P1', 'wells/W1'])
    const exact = verification?.formula?.results[0]?.formula[0] as number
    expect(exact).toBeGreaterThan(band?.[0] as number)
    expect(exact).toBeLessThan(band?.[1] as number)
  })

  it('a head held far out for want of better is swapped, a real river never; what they decide is warned of', () => {
    const model = strip({
      boundaries: [held('West', 12), held('East', 9, true)],
      points: [{ name: 'P1', x: 400, y: 200 }],
      wells: [well],
      want: { verify: true },
    })
    const { result } = solveModel(model)
    const [closed, open] = result.verification?.outerBoundary ?? []
    expect(closed?.text).toBe('"East" closed.')
    expect(open?.text).toBe('The open edges (south, north) held at the heads without wells.')
    const point = result.verification?.results[0]
    // With the east side closed nothing flows but to the well: its cone hangs on the river alone.
    const alone = solveModel({ ...model, boundaries: [held('West', 12)], want: {} }).result.points[0]?.head[0]
    expect(point?.swapped[0]?.values[0]).toBeCloseTo(alone as number, 8)
    expect(result.warnings.some(({ code }) => code === 'boundary-controlled')).toBe(true)
  })

  it('the only head of a model stays where it is', () => {
    const { result } = solveModel(
      strip({
        boundaries: [held('West', 12, true)],
        recharge: [{ name: 'Rain', rate: 0.001 }],
        want: { verify: true },
      }),
    )
    expect(result.verification?.outerBoundary[0]?.done).toBe(false)
    expect(result.verification?.outerBoundary[0]?.text).toMatch(/"West" alone holds the level/)
  })

  it('where a coarser grid has no place for a ring, a finer one is taken', () => {
    const { result } = solveModel(
      strip({
        rings: [
          {
            name: 'Pit',
            polygon: [
              [282, 182],
              [298, 182],
              [298, 198],
              [282, 198],
            ],
          },
        ],
        want: { verify: true },
      }),
    )
    expect(result.verification?.grid.grids.map(({ times }) => times)).toEqual([0.25, 0.5, 1])
    expect(result.verification?.grid.why).toMatch(/2 times as coarse: rings\[0\].polygon/)
  })

  it('halves steps in time, and names Theis where the sides are far off', () => {
    const edges = [1, 1.5, 2.2, 3.3, 5, 7.5, 11, 16, 24, 36, 54, 80, 120, 180, 270, 400, 600].map(
      (x) => x - 0.5,
    )
    const both = [...edges.map((x) => -x).reverse(), ...edges]
    const far = both.at(-1) as number
    const around: Position[] = [
      [-far, -far],
      [far, -far],
      [far, far],
      [-far, far],
      [-far, -far],
    ]
    const { result } = solveModel(
      strip({
        extent: { x: [-far, far], y: [-far, far] },
        grid: { xEdges: both, yEdges: both },
        materials: [{ name: 'Sand', kx: 8, ky: 8, specificStorage: 1e-4 }],
        time: {
          kind: 'transient',
          initialHead: 12,
          report: 'steps',
          stages: [{ duration: 0.2, firstStep: 0.002, growth: 1.4 }],
        },
        boundaries: [{ name: 'Far', kind: 'fixed head', line: around, head: 12 }],
        wells: [{ ...well, x: 0, y: 0 }],
        points: [{ name: 'P1', x: 20, y: 5 }],
        want: { verify: true },
      }),
    )
    const { verification } = result
    expect(verification?.time).toEqual({ halved: true })
    expect(verification?.formula?.source).toMatch(/Theis/)
    const last = result.times.length - 1
    const point = verification?.results.find(({ name }) => name === 'points/P1')
    // Other runs report the ends of stages only: steps before have no band.
    expect(point?.band[0]).toBeNull()
    const [low, high] = point?.band[last] ?? [0, 0]
    const exact = verification?.formula?.results[0]?.formula[last] as number
    expect(exact).toBeGreaterThan(low)
    expect(exact).toBeLessThan(high)
    expect(high - low).toBeLessThan(0.2 * (12 - exact))
  })

  it('a cancelled run says so and has no verification', () => {
    let stop = false
    const solution = solveModel(strip({ wells: [well], want: { verify: true } }), {
      onProgress: ({ phase }) => {
        if (phase.startsWith('verification')) stop = true
      },
      isCancelled: () => stop,
    })
    expect(solution.cancelled).toBe(true)
    expect(solution.result.verification).toBeUndefined()
  })
})

describe('drawdown', () => {
  it('is the formula of a well between two held sides, whatever flows through', () => {
    const points = [{ name: 'P1', x: 400, y: 200 }]
    const { result, pictures } = solveModel(strip({ wells: [well], points, want: { drawdown: true } }))
    const even = solveModel(
      strip({ boundaries: [held('West', 10), held('East', 10)], wells: [well], points }),
    )
    expect(result.drawdown?.points[0]?.drawdown[0]).toBeCloseTo(
      10 - (even.result.points[0]?.head[0] as number),
      8,
    )
    expect(result.drawdown?.wells[0]?.drawdown[0]).toBeGreaterThan(
      result.drawdown?.points[0]?.drawdown[0] as number,
    )
    const most = pictures.drawdown?.reduce((largest, value) => Math.max(largest, value), 0) as number
    expect(most).toBeGreaterThan(result.drawdown?.points[0]?.drawdown[0] as number)
  })

  it('grows in time from nothing', () => {
    const { result } = solveModel(
      strip({
        materials: [{ name: 'Sand', kx: 8, ky: 8, specificStorage: 1e-4 }],
        time: { kind: 'transient', initialHead: 'steady', stages: [{ duration: 0.05 }, { duration: 30 }] },
        wells: [well],
        points: [{ name: 'P1', x: 400, y: 200 }],
        want: { drawdown: true },
      }),
    )
    const [early = 0, late = 0] = (result.drawdown?.points[0]?.drawdown ?? []) as number[]
    expect(early).toBeGreaterThan(0)
    expect(late).toBeGreaterThan(2 * early)
  })
})
