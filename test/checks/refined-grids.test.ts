import { describe, expect, it } from 'vitest'
import type { Model, Position } from '~/solver/model'
import { check, fixed, head, heldAllRound, intoModel, rectangle, relative, sheet, solvedByBoth } from './plan'

/** A strip with a wall that leaves an opening at its south side, held on its west and east ends. */
function strip(
  inputs: {
    width_m: number
    length_each_side_m: number
    opening_m: number
    T_m2_s: number
    head_difference_m: number
  },
  grid: Model['grid'],
) {
  const { width_m: width, length_each_side_m: length } = inputs
  return solvedByBoth({
    ...sheet(inputs.T_m2_s),
    extent: { x: [-length, length], y: [0, width] },
    grid,
    boundaries: [
      fixed(
        'Up',
        [
          [-length, 0],
          [-length, width],
        ],
        inputs.head_difference_m,
      ),
      fixed(
        'Down',
        [
          [length, 0],
          [length, width],
        ],
        0,
      ),
    ],
    walls: [
      {
        name: 'Barrier',
        line: [
          [0, inputs.opening_m],
          [0, width],
        ],
        thickness: 1,
        k: 0,
      },
    ],
  })
}

describe('PS-15', () => {
  const { title, source, inputs, expected } = check<Parameters<typeof strip>[0], { flow_m3_s: number }>(
    'PS-15',
  )
  const error = (grid: Model['grid']) => relative(intoModel(strip(inputs, grid), 'Up'), expected.flow_m3_s)

  it(`${title}: 0.02 % at 40 cells across, where a plain five-point scheme reached 0.6 % (${source})`, () => {
    expect(error({ columns: 240, rows: 40 })).toBeLessThan(2e-4)
  })

  it('second order although the wall ends inside the grid', () => {
    const coarse = error({ columns: 60, rows: 12 })
    const fine = error({ columns: 120, rows: 24 })
    expect(coarse).toBeLessThan(3e-3)
    expect(Math.log2(coarse / fine)).toBeGreaterThan(1.5)
  })

  it('within 0.1 % on a planned grid of five-metre cells refined at the tip to a quarter metre', () => {
    expect(error({ cellSize: 5, refine: [{ x: 0, y: inputs.opening_m, cellSize: 0.25 }] })).toBeLessThan(1e-3)
  })

  it('a wall that ends anywhere inside a cell is as long as it is, to a twentieth of a cell', () => {
    // Flow changes with the opening w by the formula: the length that a flow stands for follows from it.
    const { width_m: width, length_each_side_m: length, T_m2_s: t, head_difference_m: drop } = inputs
    for (const part of [0, 0.2, 0.4, 0.5, 0.7, 0.9]) {
      const opening = inputs.opening_m + part * 2.5
      const flow = intoModel(strip({ ...inputs, opening_m: opening }, { columns: 240, rows: 40 }), 'Up')
      const extra = (t * width * drop) / flow - 2 * length
      const seen = (2 * width * Math.asin(Math.exp((-extra * Math.PI) / (4 * width)))) / Math.PI
      expect(Math.abs(seen - opening)).toBeLessThan(0.05 * 2.5)
    }
  })
})

interface PileInputs {
  kh: number
  kv: number
  drop: number
  depth: number
  pile: number
  /** How far the section reaches to each side. */
  reach: number
  points?: [number, number][]
}

/** A sheet pile in a layer with the water standing at different levels on its two sides; y upwards from the base. */
function sheetPile({ kh, kv, drop, depth, pile, reach, points = [] }: PileInputs, grid: Model['grid']) {
  const surface = (from: number, to: number): Position[] => [
    [from, depth],
    [to, depth],
  ]
  return solvedByBoth({
    kind: 'section',
    flow: 'saturated',
    materials: [{ name: 'Layer', kx: kh, ky: kv }],
    ground: [{ material: 'Layer' }],
    extent: { x: [-reach, reach], y: [0, depth] },
    grid,
    boundaries: [
      fixed('Upstream bed', surface(-reach, 0), depth + drop),
      fixed('Downstream bed', surface(0, reach), depth),
    ],
    walls: [
      {
        name: 'Pile',
        line: [
          [0, depth - pile],
          [0, depth],
        ],
        thickness: 0.02,
        k: 0,
      },
    ],
    points: points.map(([x, z], k) => ({ name: `${k}`, x, y: depth - z })),
  })
}

describe('SE-01', () => {
  const { title, source, inputs, expected } = check<
    {
      k_m_s: number
      head_difference_m: number
      layer_depth_m: number
      pile_depth_m: number[]
      points_x_z: [number, number][]
    },
    {
      flow_per_m: Record<string, number>
      form_factor: Record<string, number>
      head_at_points: Record<string, number[]>
    }
  >('SE-01')
  const depth = inputs.layer_depth_m
  const drop = inputs.head_difference_m
  const byDepth = (record: Record<string, unknown>, pile: number) =>
    record[Object.keys(record).find((key) => Number(key) === pile) ?? '']

  it.each(inputs.pile_depth_m)(
    `${title}, %d m deep: the form factor within 0.05 % at 200 cells across (${source})`,
    (pile) => {
      const solution = sheetPile(
        {
          kh: inputs.k_m_s,
          kv: inputs.k_m_s,
          drop,
          depth,
          pile,
          reach: 5 * depth,
          points: inputs.points_x_z,
        },
        { cellSize: depth / 20, refine: [{ x: 0, y: depth - pile, cellSize: depth / 20 }] },
      )
      expect(solution.result.grid.columns).toBe(200)
      const factor = intoModel(solution, 'Upstream bed') / (inputs.k_m_s * drop)
      expect(relative(factor, byDepth(expected.form_factor, pile) as number)).toBeLessThan(5e-4)
      const levels = byDepth(expected.head_at_points, pile) as number[]
      levels.forEach((level, k) => {
        expect(Math.abs(head(solution, `${k}`) - depth - level)).toBeLessThan(0.003 * drop)
      })
    },
  )

  it.each(inputs.pile_depth_m)(
    '%d m deep, on fewer cells that shrink towards the tip: within half a percent',
    (pile) => {
      const solution = sheetPile(
        { kh: inputs.k_m_s, kv: inputs.k_m_s, drop, depth, pile, reach: 3 * depth },
        { cellSize: depth / 12, refine: [{ x: 0, y: depth - pile, cellSize: depth / 120 }] },
      )
      expect(solution.result.grid.cells).toBeLessThan(2500)
      const factor = intoModel(solution, 'Upstream bed') / (inputs.k_m_s * drop)
      expect(relative(factor, byDepth(expected.form_factor, pile) as number)).toBeLessThan(5e-3)
    },
  )
})

describe('SE-02', () => {
  const { title, source, inputs, expected } = check<
    {
      kh_m_s: number
      kv_m_s: number
      head_difference_m: number
      layer_depth_m: number
      pile_depth_m: number
    },
    { flow_per_m: number }
  >('SE-02')

  it(`${title}: within 0.05 % at cells of a tenth of the depth (${source})`, () => {
    const depth = inputs.layer_depth_m
    const solution = sheetPile(
      {
        kh: inputs.kh_m_s,
        kv: inputs.kv_m_s,
        drop: inputs.head_difference_m,
        depth,
        pile: inputs.pile_depth_m,
        reach: 10 * depth,
      },
      { cellSize: depth / 10 },
    )
    expect(relative(intoModel(solution, 'Upstream bed'), expected.flow_per_m)).toBeLessThan(5e-4)
  })
})

describe('CO-12', () => {
  const { title, source, inputs, expected } = check<
    {
      layers: { top_depth_m: number; base_depth_m: number; k: number }[]
      cutoff: { x: number; depth_m: number }
      upstream_head_m: number
      downstream_head_m: number
      model_x_m: [number, number]
      points_x_depth: Record<string, [number, number]>
    },
    { values: { flow: number; head_A: number; head_B: number; head_C: number } }
  >('CO-12')

  it(`${title}: flow within 0.1 %, heads within 2 mm at half-metre cells (${source})`, () => {
    const depth = Math.max(...inputs.layers.map((layer) => layer.base_depth_m))
    const [west, east] = inputs.model_x_m
    const solution = solvedByBoth({
      kind: 'section',
      flow: 'saturated',
      materials: inputs.layers.map(({ k }, index) => ({ name: `Layer ${index}`, kx: k, ky: k })),
      ground: inputs.layers.map(({ top_depth_m, base_depth_m }, index) => ({
        material: `Layer ${index}`,
        polygon: [
          [west, depth - base_depth_m],
          [east, depth - base_depth_m],
          [east, depth - top_depth_m],
          [west, depth - top_depth_m],
        ] as Position[],
      })),
      extent: { x: [west, east], y: [0, depth] },
      grid: { cellSize: 0.5 },
      boundaries: [
        fixed(
          'Upstream',
          [
            [west, depth],
            [inputs.cutoff.x, depth],
          ],
          depth + inputs.upstream_head_m,
        ),
        fixed(
          'Downstream',
          [
            [inputs.cutoff.x, depth],
            [east, depth],
          ],
          depth + inputs.downstream_head_m,
        ),
      ],
      walls: [
        {
          name: 'Cut-off',
          line: [
            [inputs.cutoff.x, depth - inputs.cutoff.depth_m],
            [inputs.cutoff.x, depth],
          ],
          thickness: 0.5,
          k: 0,
        },
      ],
      points: Object.entries(inputs.points_x_depth).map(([name, [x, z]]) => ({ name, x, y: depth - z })),
    })
    const { flow, head_A, head_B, head_C } = expected.values
    expect(relative(intoModel(solution, 'Upstream'), flow)).toBeLessThan(1e-3)
    for (const [name, level] of [
      ['A', head_A],
      ['B', head_B],
      ['C', head_C],
    ] as const) {
      expect(Math.abs(head(solution, name) - depth - level)).toBeLessThan(2e-3)
    }
  })
})

describe('walls oblique to the grid', () => {
  /** A turned field, held along its two long sides, with a wall along its middle: the flow from side to side. */
  function through(angle: number, cell: number, resistance: number): number {
    const [c, s] = [Math.cos((angle * Math.PI) / 180), Math.sin((angle * Math.PI) / 180)]
    const turned = (u: number, v: number): Position => [c * u - s * v, s * u + c * v]
    const polygon = [turned(-100, -30), turned(100, -30), turned(100, 30), turned(-100, 30)] as const
    const solution = solvedByBoth({
      ...sheet(1),
      ground: [{ material: 'Ground', base: -1001, top: -1000, polygon: [...polygon] }],
      extent: { x: [-140, 140], y: [-140, 140] },
      grid: { columns: 280 / cell, rows: 280 / cell },
      boundaries: [fixed('High', [polygon[0], polygon[1]], 1), fixed('Low', [polygon[3], polygon[2]], 0)],
      walls: [
        {
          name: 'Wall',
          line: [turned(-110, 0.37), turned(110, 0.37)],
          thickness: 1,
          k: resistance === Number.POSITIVE_INFINITY ? 0 : 1 / resistance,
        },
      ],
    })
    return intoModel(solution, 'High')
  }

  it.each([10, 30, 45, 63])(
    'at %d degrees a wall leaks as much as along the grid, to 1.6 percent on fifty cells along it and 0.4 percent on two hundred',
    (angle) => {
      for (const resistance of [30, 3000]) {
        const exact = 200 / (60 + resistance)
        expect(relative(through(0, 2, resistance), exact)).toBeLessThan(1e-4)
        expect(relative(through(angle, 4, resistance), exact)).toBeLessThan(0.016)
        expect(relative(through(angle, 1, resistance), exact)).toBeLessThan(0.004)
      }
    },
    30_000,
  )

  it.each([0, 10, 30, 45, 63, 90])('at %d degrees a wall with k = 0 leaks nowhere', (angle) => {
    expect(Math.abs(through(angle, 4, Number.POSITIVE_INFINITY))).toBeLessThan(1e-9)
  })

  /** Length of a plate across even flow that the head beside its middle stands for (Lamb 1932, article 71), in cells. */
  function lengthSeen(angle: number, cell: number): number {
    const [c, s] = [Math.cos((angle * Math.PI) / 180), Math.sin((angle * Math.PI) / 180)]
    const half = 30
    const [x0, y0] = [1, 0.6]
    const turned = (u: number, v: number): Position => [x0 + c * u - s * v, y0 + s * u + c * v]
    // The imaginary part of root(z^2 - a^2) is the head around a plate that even flow meets at a right angle.
    const level = ([x, y]: Position) => {
      const [u, v] = [c * (x - x0) + s * (y - y0), -s * (x - x0) + c * (y - y0)]
      const real = u * u - v * v - half * half
      return (v < 0 ? 1 : -1) * Math.sqrt((Math.hypot(real, 2 * u * v) - real) / 2)
    }
    const extent = { x: [-100, 100] as [number, number], y: [-100, 100] as [number, number] }
    const [left, right] = [turned(0, 8), turned(0, -8)]
    const solution = solvedByBoth({
      ...sheet(1),
      extent,
      grid: { columns: 200 / cell, rows: 200 / cell },
      boundaries: heldAllRound(extent, level),
      walls: [{ name: 'Plate', line: [turned(-half, 0), turned(half, 0)], thickness: 1, k: 0 }],
      points: [
        { name: 'left', x: left[0], y: left[1] },
        { name: 'right', x: right[0], y: right[1] },
      ],
    })
    const jump = (head(solution, 'right') - head(solution, 'left')) / 2
    return (Math.sqrt(jump * jump - 64) - half) / cell
  }

  it.each([15, 30, 45, 71])(
    'at %d degrees an end inside the ground is right to a quarter of a cell',
    (angle) => {
      expect(Math.abs(lengthSeen(angle, 5))).toBeLessThan(0.25)
      expect(Math.abs(lengthSeen(angle, 2.5))).toBeLessThan(0.25)
    },
  )

  it('an end that meets held water is tight', () => {
    const solution = solvedByBoth({
      ...sheet(1),
      extent: { x: [0, 100], y: [0, 20] },
      grid: { columns: 20, rows: 4 },
      boundaries: [
        { name: 'Lake', kind: 'fixed head', polygon: rectangle(0, 100, 10, 20), head: 10 },
        fixed(
          'West',
          [
            [0, 0],
            [0, 10],
          ],
          12,
        ),
      ],
      walls: [
        {
          name: 'Wall',
          line: [
            [50, 0],
            [50, 10],
          ],
          thickness: 1,
          k: 0,
        },
      ],
      points: [{ name: 'behind', x: 52.5, y: 7.5 }],
    })
    expect(Math.abs(head(solution, 'behind') - 10)).toBeLessThan(1e-9)
  })

  it('along the grid it is right to a thirtieth', () => {
    expect(Math.abs(lengthSeen(0, 5))).toBeLessThan(0.03)
    expect(Math.abs(lengthSeen(90, 2.5))).toBeLessThan(0.03)
  })
})
