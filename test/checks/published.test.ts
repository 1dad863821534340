import { describe, expect, it } from 'vitest'
import type { Position } from '~/solver/model'
import type { Solution } from '~/solver/solve'
import {
  abstraction,
  between,
  check,
  circle,
  closed,
  faceHead,
  fixed,
  head,
  intoModel,
  relative,
  sheet,
  solvedByBoth,
} from './plan'

describe('PS-01', () => {
  const { title, source, inputs, expected } = check<
    { L_m: number; T_m2_s: number; h_west_m: number; h_east_m: number },
    { head_at_x: Record<string, number>; inflow_west_per_m: number; inflow_east_per_m: number }
  >('PS-01')
  const width = 30
  const strip = (columns: number, rate: number) =>
    solvedByBoth({
      ...sheet(inputs.T_m2_s),
      extent: { x: [0, inputs.L_m], y: [0, width] },
      grid: { columns, rows: 3 },
      recharge: rate === 0 ? [] : [{ name: 'Rain', rate }],
      boundaries: [
        fixed('West', between([0, 0], [0, width]), inputs.h_west_m),
        fixed('East', between([inputs.L_m, 0], [inputs.L_m, width]), inputs.h_east_m),
      ],
      points: Object.keys(expected.head_at_x).map((x) => ({ name: x, x: Number(x), y: 15 })),
    })

  it.each([1, 7, 100])(`${title} on %i cells (${source})`, (columns) => {
    const solution = strip(columns, 0)
    for (const [x, level] of Object.entries(expected.head_at_x)) {
      expect(Math.abs(head(solution, x) - level)).toBeLessThan(1e-6)
    }
    expect(relative(intoModel(solution, 'West') / width, expected.inflow_west_per_m)).toBeLessThan(1e-7)
    expect(relative(intoModel(solution, 'East') / width, expected.inflow_east_per_m)).toBeLessThan(1e-7)
  })

  it('with recharge the error at a cell centre stays within N dx² / 8T', () => {
    const rate = 2e-8
    const columns = 50
    const dx = inputs.L_m / columns
    const solution = strip(columns, rate)
    const { heads } = solution
    for (let i = 0; i < columns; i++) {
      const x = (i + 0.5) * dx
      const exact =
        inputs.h_west_m -
        ((inputs.h_west_m - inputs.h_east_m) * x) / inputs.L_m +
        (rate * x * (inputs.L_m - x)) / (2 * inputs.T_m2_s)
      const error = Math.abs((heads[columns + i] as number) - exact)
      expect(error).toBeLessThanOrEqual((rate * dx * dx) / (8 * inputs.T_m2_s) + 1e-7)
    }
  })
})

describe.each(['PS-02', 'PS-02b'])('%s', (id) => {
  const { title, source, inputs, expected } = check<
    { K_m_s: number; h_x0_m: number; h_xL_m: number; L_m: number; recharge_m_s: number; base_m: number },
    { head_at_x: Record<string, number>; divide_x: number; h_max: number; flux_x0: number; flux_xL: number }
  >(id)

  it(`${title} (${source})`, () => {
    const solution = solvedByBoth({
      flow: 'unconfined',
      materials: [{ name: 'Ground', kx: inputs.K_m_s, ky: inputs.K_m_s }],
      ground: [{ material: 'Ground', base: inputs.base_m }],
      extent: { x: [0, inputs.L_m], y: [0, 10] },
      grid: { columns: 100, rows: 1 },
      recharge: [{ name: 'Rain', rate: inputs.recharge_m_s }],
      boundaries: [
        fixed('River', between([0, 0], [0, 10]), inputs.h_x0_m),
        fixed('Canal', between([inputs.L_m, 0], [inputs.L_m, 10]), inputs.h_xL_m),
      ],
      points: [
        ...Object.keys(expected.head_at_x).map((x) => ({ name: x, x: Number(x), y: 5 })),
        { name: 'divide', x: expected.divide_x, y: 5 },
      ],
    })
    for (const [x, level] of Object.entries(expected.head_at_x)) {
      expect(Math.abs(head(solution, x) - level)).toBeLessThan(0.002)
    }
    expect(Math.abs(head(solution, 'divide') - expected.h_max)).toBeLessThan(0.002)
    const west = intoModel(solution, 'River') / 10
    expect(relative(west, expected.flux_x0)).toBeLessThan(1e-6)
    expect(relative(-intoModel(solution, 'Canal') / 10, expected.flux_xL)).toBeLessThan(1e-6)
    expect(relative(-west / inputs.recharge_m_s, expected.divide_x)).toBeLessThan(1e-6)
  })
})

interface CircleInputs {
  Q_m3_s: number
  T_m2_s: number
  K_m_s: number
  recharge_m_s: number
  R_m: number
  H_m: number
  H_rim_m: number
  r_m: number[]
}

/** A well in the middle of a circle cut in staircase out of square cells, the head fixed at the rim's faces. */
function island(inputs: CircleInputs, cell: number, unconfined: boolean): Solution {
  const cells = 2 * Math.ceil(inputs.R_m / cell) + 1
  const half = (cells * cell) / 2
  const rim = circle(inputs.R_m)
  const k = unconfined ? inputs.K_m_s : inputs.T_m2_s
  return solvedByBoth({
    flow: unconfined ? 'unconfined' : 'confined',
    materials: [{ name: 'Ground', kx: k, ky: k }],
    ground: [
      { material: 'Ground', polygon: rim, ...(unconfined ? { base: 0 } : { base: -1001, top: -1000 }) },
    ],
    extent: { x: [-half, half], y: [-half, half] },
    grid: { columns: cells, rows: cells },
    wells: [abstraction(0, 0, inputs.Q_m3_s, inputs.r_m[0] as number)],
    recharge: inputs.recharge_m_s ? [{ name: 'Rain', rate: inputs.recharge_m_s }] : [],
    boundaries: [fixed('Rim', closed(rim), inputs.H_m ?? inputs.H_rim_m)],
    points: inputs.r_m.slice(1).flatMap((r) => [
      { name: `${r} east`, x: r, y: 0 },
      { name: `${r} north-east`, x: r * Math.SQRT1_2, y: r * Math.SQRT1_2 },
    ]),
  })
}

describe.each([
  ['PS-03', 10, false],
  ['PS-03b', 5, false],
  ['PS-04', 5, true],
] as const)('%s', (id, cell, unconfined) => {
  const { title, source, inputs, expected } = check<CircleInputs, { head: number[] }>(id)

  it(`${title}: within 1 % of the drawdown from five cells outwards and at the well face (${source})`, () => {
    const solution = island(inputs, cell, unconfined)
    const radii = inputs.r_m.map((r, index) => ({ r, level: expected.head[index] as number }))
    const outside = radii.filter(({ r }) => r >= 5 * cell)
    expect(outside.length).toBeGreaterThanOrEqual(2)
    for (const { r, level } of outside) {
      for (const direction of ['east', 'north-east']) {
        const error = Math.abs(head(solution, `${r} ${direction}`) - level)
        expect(error / (inputs.H_m - level)).toBeLessThan(0.01)
      }
    }
    const face = faceHead(solution)
    const level = expected.head[0] as number
    expect(Math.abs(face - level) / (inputs.H_m - level)).toBeLessThan(0.01)
    if (unconfined) return
    const [near, far] = outside.slice(-2)
    if (!near || !far) throw new Error('two radii are needed')
    const rise = head(solution, `${far.r} east`) - head(solution, `${near.r} east`)
    const back = (inputs.Q_m3_s * Math.log(far.r / near.r)) / (2 * Math.PI * rise)
    expect(relative(back, inputs.T_m2_s)).toBeLessThan(0.01)
  })
})

describe('PS-06', () => {
  const { title, source, inputs, expected } = check<
    CircleInputs,
    { head: number[]; rim_outflow_m3_s: number }
  >('PS-06')

  it(`${title} (${source})`, () => {
    const solution = island(inputs, 10, true)
    const area = solution.result.grid.active * 100
    expect(relative(area, Math.PI * inputs.R_m ** 2)).toBeLessThan(0.002)
    inputs.r_m.forEach((r, index) => {
      if (r < 50) return
      for (const direction of ['east', 'north-east']) {
        expect(Math.abs(head(solution, `${r} ${direction}`) - (expected.head[index] as number))).toBeLessThan(
          0.0035,
        )
      }
    })
    expect(relative(-intoModel(solution, 'Rim'), expected.rim_outflow_m3_s)).toBeLessThan(0.003)
  })
})

describe('PS-08', () => {
  const { title, source, inputs, expected } = check<
    {
      x_extent_m: number
      T_m2_s: number
      recharge_m_s: number
      H_m: number
      points_from_centre_m: Position[]
    },
    { head: number[]; mean_head: number; total_m3_s: number; outflow_one_x_side_m3_s: number }
  >('PS-08')

  it(`${title} (${source})`, () => {
    const a = inputs.x_extent_m / 2
    const solution = solvedByBoth({
      ...sheet(inputs.T_m2_s),
      extent: { x: [-a, a], y: [-a, a] },
      grid: { columns: 100, rows: 100 },
      recharge: [{ name: 'Rain', rate: inputs.recharge_m_s }],
      solver: { tolerance: 3e-14 },
      boundaries: [
        fixed('West', between([-a, -a], [-a, a]), inputs.H_m),
        fixed('East', between([a, -a], [a, a]), inputs.H_m),
        fixed('South', between([-a, -a], [a, -a]), inputs.H_m),
        fixed('North', between([-a, a], [a, a]), inputs.H_m),
      ],
      points: inputs.points_from_centre_m.map(([x, y], index) => ({ name: String(index), x, y })),
    })
    expected.head.forEach((level, index) => {
      expect(Math.abs(head(solution, String(index)) - level)).toBeLessThan(5e-5)
    })
    const mean = solution.heads.reduce((sum, level) => sum + level, 0) / solution.heads.length
    expect(Math.abs(mean - expected.mean_head)).toBeLessThan(5e-5)
    const side = (inputs.recharge_m_s * inputs.x_extent_m ** 2) / 4
    expect(relative(side, expected.outflow_one_x_side_m3_s)).toBeLessThan(1e-7)
    for (const name of ['West', 'East', 'South', 'North']) {
      expect(relative(-intoModel(solution, name), side)).toBeLessThan(8e-12)
    }
  })
})

describe('PS-09', () => {
  const { title, source, inputs, expected } = check<
    { Q_m3_s: number; T_m2_s: number; distance_m: number; points_xy_from_river_m: Position[] },
    { drawdown: number[]; river_inflow_between_minus60_and_60_m3_s: number }
  >('PS-09')

  it(`${title}, the far sides from the formula (${source})`, () => {
    const { Q_m3_s: rate, T_m2_s: t, distance_m: a } = inputs
    const level = ([x, y]: Position) =>
      (-rate / (4 * Math.PI * t)) * Math.log(((x + a) ** 2 + y * y) / ((x - a) ** 2 + y * y))
    const far = (name: string, from: Position, to: Position) => {
      const line = between(from, to, 200)
      return fixed(name, line, line.map(level))
    }
    const solution = solvedByBoth({
      ...sheet(t),
      extent: { x: [0, 1000], y: [-1000, 1000] },
      grid: { columns: 100, rows: 200 },
      wells: [abstraction(a, 0, rate, 0.2)],
      boundaries: [
        fixed('River south', between([0, -1000], [0, -60]), 0),
        fixed('River', between([0, -60], [0, 60]), 0),
        fixed('River north', between([0, 60], [0, 1000]), 0),
        far('South', [0, -1000], [1000, -1000]),
        far('East', [1000, -1000], [1000, 1000]),
        far('North', [0, 1000], [1000, 1000]),
      ],
      points: inputs.points_xy_from_river_m.map(([x, y], index) => ({ name: String(index), x, y })),
    })
    inputs.points_xy_from_river_m.forEach(([x, y], index) => {
      if (Math.hypot(x - a, y) < 30) return
      const drawdown = expected.drawdown[index] as number
      expect(Math.abs(-head(solution, String(index)) - drawdown)).toBeLessThanOrEqual(0.005 * drawdown + 1e-9)
    })
    const face = -faceHead(solution)
    expect(relative(face, expected.drawdown[0] as number)).toBeLessThan(0.001)
    const river = intoModel(solution, 'River')
    expect(relative(river, expected.river_inflow_between_minus60_and_60_m3_s)).toBeLessThan(1e-6)
  })
})

describe('PS-10', () => {
  const { title, source, inputs, expected } = check<
    { Q_m3_s: number; T_m2_s: number; width_m: number; well_xy_m: Position; points_xy_m: Position[] },
    { drawdown: number[]; inflow_from_x0_side: number; inflow_from_xL_side: number }
  >('PS-10')

  it(`${title} (${source})`, () => {
    const [x, y] = inputs.well_xy_m
    const solution = solvedByBoth({
      ...sheet(inputs.T_m2_s),
      extent: { x: [0, inputs.width_m], y: [-800, 800] },
      grid: { columns: 40, rows: 160 },
      wells: [abstraction(x, y, inputs.Q_m3_s, 0.25)],
      boundaries: [
        fixed('West', between([0, -800], [0, 800]), 0),
        fixed('East', between([inputs.width_m, -800], [inputs.width_m, 800]), 0),
      ],
      points: inputs.points_xy_m.map(([px, py], index) => ({ name: String(index), x: px, y: py })),
    })
    expect(solution.result.noFlowEdges).toEqual(['north', 'south'])
    inputs.points_xy_m.forEach(([px, py], index) => {
      if (Math.hypot(px - x, py - y) < 30) return
      const drawdown = expected.drawdown[index] as number
      expect(relative(-head(solution, String(index)), drawdown)).toBeLessThan(0.002)
    })
    const face = -faceHead(solution)
    expect(relative(face, expected.drawdown[0] as number)).toBeLessThan(5e-4)
    expect(relative(intoModel(solution, 'West'), expected.inflow_from_x0_side)).toBeLessThan(1e-6)
    expect(relative(intoModel(solution, 'East'), expected.inflow_from_xL_side)).toBeLessThan(1e-6)
  })
})

describe('PS-13', () => {
  const { title, source, inputs, expected } = check<
    { series: { length_m: number; T_m2_s: number }[]; h_left: number; h_right: number },
    { series_flux_per_m: number; interface_heads: number[]; parallel_total_flux_for_400m_length: number }
  >('PS-13')
  const ends = inputs.series.map((_, k) =>
    inputs.series.slice(0, k + 1).reduce((sum, zone) => sum + zone.length_m, 0),
  )
  const materials = inputs.series.map((zone, k) => ({ name: `Zone ${k}`, kx: zone.T_m2_s, ky: zone.T_m2_s }))
  const boundaries = [
    fixed('Left', between([0, 0], [0, 400]), inputs.h_left),
    fixed('Right', between([400, 0], [400, 400]), inputs.h_right),
  ]
  const box = { extent: { x: [0, 400] as Position, y: [0, 400] as Position }, materials, boundaries }
  const zones = (along: 'x' | 'y') =>
    inputs.series.map((zone, k) => {
      const to = ends[k] as number
      const from = to - zone.length_m
      const polygon: Position[] =
        along === 'x'
          ? [
              [from, 0],
              [to, 0],
              [to, 400],
              [from, 400],
            ]
          : [
              [0, from],
              [400, from],
              [400, to],
              [0, to],
            ]
      return { material: `Zone ${k}`, polygon, base: -1, top: 0 }
    })

  it(`${title}: in series (${source})`, () => {
    const solution = solvedByBoth({
      ...box,
      grid: { columns: 40, rows: 2 },
      ground: zones('x'),
      solver: { tolerance: 1e-14 },
    })
    const flux = intoModel(solution, 'Left') / 400
    const exact =
      (inputs.h_left - inputs.h_right) /
      inputs.series.reduce((sum, zone) => sum + zone.length_m / zone.T_m2_s, 0)
    expect(relative(exact, expected.series_flux_per_m)).toBeLessThan(1e-7)
    expect(relative(flux, exact)).toBeLessThan(1e-9)
    ends.slice(0, -1).forEach((x, k) => {
      // From the last centre of the zone on to its end.
      const centre = solution.heads[x / 10 - 1] as number
      const level = centre - (flux * 5) / (inputs.series[k]?.T_m2_s as number)
      expect(Math.abs(level - (expected.interface_heads[k + 1] as number))).toBeLessThan(1e-6)
    })
  })

  it(`${title}: in parallel (${source})`, () => {
    const solution = solvedByBoth({
      ...box,
      grid: { columns: 2, rows: 40 },
      ground: zones('y'),
      solver: { tolerance: 1e-14 },
    })
    expect(relative(intoModel(solution, 'Left'), expected.parallel_total_flux_for_400m_length)).toBeLessThan(
      1e-9,
    )
  })
})

describe('PS-15', () => {
  const { title, source, inputs, expected } = check<
    {
      width_m: number
      length_each_side_m: number
      opening_m: number
      T_m2_s: number
      head_difference_m: number
    },
    { flow_m3_s: number; flow_without_wall: number }
  >('PS-15')
  const { width_m: width, length_each_side_m: length } = inputs
  const strip = (walled: boolean) =>
    solvedByBoth({
      ...sheet(inputs.T_m2_s),
      extent: { x: [-length, length], y: [0, width] },
      grid: { columns: 240, rows: 40 },
      boundaries: [
        fixed('Up', between([-length, 0], [-length, width]), inputs.head_difference_m),
        fixed('Down', between([length, 0], [length, width]), 0),
      ],
      walls: walled
        ? [
            {
              name: 'Barrier',
              line: [
                [0, inputs.opening_m],
                [0, width],
              ],
              thickness: 1,
              k: 0,
            },
          ]
        : [],
    })

  it(`${title} (${source})`, () => {
    expect(relative(intoModel(strip(false), 'Up'), expected.flow_without_wall)).toBeLessThan(1e-7)
    expect(relative(intoModel(strip(true), 'Up'), expected.flow_m3_s)).toBeLessThan(2e-4)
  })
})
