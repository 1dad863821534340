import { describe, expect, it } from 'vitest'
import type { Position } from '~/solver/model'
import type { Solution } from '~/solver/solve'
import {
  abstraction,
  aroundACell,
  check,
  extentOf,
  faceHead,
  fixed,
  head,
  heldAllRound,
  intoModel,
  relative,
  sheet,
  sideLine,
  solvedByBoth,
} from './plan'

describe('PS-05', () => {
  const { title, source, inputs, expected } = check<
    {
      Q_m3_h: number
      H0_m: number
      r1_m: number
      s1_m: number
      r2_m: number
      s2_m: number
      well_diameter_m: number
    },
    { K_m_d: number; K_m_s: number; drawdown_at_pumped_well_m: number }
  >('PS-05')

  it(`${title}: the model gives the drawdowns back from that K, and they that K (${source})`, () => {
    const { r1_m: r1, r2_m: r2 } = inputs
    const rate = inputs.Q_m3_h / 3600
    const k = expected.K_m_s
    const outer = inputs.H0_m - inputs.s2_m
    const level = ([x, y]: Position) =>
      Math.sqrt(outer ** 2 + (rate / (Math.PI * k)) * Math.log(Math.hypot(x, y) / r2))
    const extent = { x: [-50.5, 50.5] as Position, y: [-50.5, 50.5] as Position }
    const solution = solvedByBoth({
      flow: 'unconfined',
      materials: [{ name: 'Ground', kx: k, ky: k }],
      ground: [{ material: 'Ground', base: 0 }],
      extent,
      grid: { columns: 101, rows: 101 },
      wells: [abstraction(0, 0, rate, inputs.well_diameter_m / 2)],
      boundaries: heldAllRound(extent, level),
      points: [
        { name: 'near', x: r1, y: 0 },
        { name: 'far', x: r2, y: 0 },
      ],
    })
    const near = head(solution, 'near')
    const far = head(solution, 'far')
    expect(Math.abs(inputs.H0_m - near - inputs.s1_m)).toBeLessThan(5e-4)
    expect(Math.abs(inputs.H0_m - far - inputs.s2_m)).toBeLessThan(5e-4)
    expect(relative(inputs.H0_m - faceHead(solution), expected.drawdown_at_pumped_well_m)).toBeLessThan(5e-4)
    const back = (rate * Math.log(r2 / r1)) / (Math.PI * (far ** 2 - near ** 2))
    expect(relative(86400 * back, expected.K_m_d)).toBeLessThan(5e-4)
  })
})

describe('PS-07', () => {
  interface Row {
    k1: number
    k2: number
    centre: number
    mean: number
    flux_one_long_side: number
    flux_one_short_side: number
    max_gradient_mid_long_side: number
  }
  const { title, inputs, expected } = check<
    { side_ratios: number[] },
    { table: Record<string, Row>; handbook_k1: Record<string, number>; handbook_k2: Record<string, number> }
  >('PS-07')

  it.each(inputs.side_ratios)(`${title}: sides 1 to %d`, (ratio) => {
    const row = expected.table[String(ratio)] as Row
    const columns = 2 * Math.round(32 * ratio)
    const extent = { x: [0, ratio] as Position, y: [0, 1] as Position }
    const solution = solvedByBoth({
      ...sheet(1),
      extent,
      grid: { columns, rows: 64 },
      recharge: [{ name: 'Rain', rate: 1 }],
      boundaries: heldAllRound(extent, () => 0),
      points: [{ name: 'centre', x: ratio / 2, y: 0.5 }],
    })
    const mean = solution.heads.reduce((sum, level) => sum + level, 0) / solution.heads.length
    expect(relative(head(solution, 'centre'), row.centre)).toBeLessThan(0.001)
    expect(relative(mean, row.mean)).toBeLessThan(0.001)
    for (const side of ['south', 'north']) {
      expect(relative(-intoModel(solution, side), row.flux_one_long_side)).toBeLessThan(0.002)
    }
    for (const side of ['west', 'east']) {
      expect(relative(-intoModel(solution, side), row.flux_one_short_side)).toBeLessThan(0.002)
    }
    // The head is 0 at the face, half a cell from the centre of the cell in mid of the long side.
    const gradient = 128 * (solution.heads[columns / 2] as number)
    expect(relative(gradient, row.max_gradient_mid_long_side)).toBeLessThan(0.001)
    const k1 = 4 * mean
    expect(relative(k1, row.k1)).toBeLessThan(0.001)
    expect(relative(k1 / (2 * gradient), row.k2)).toBeLessThan(0.002)
    expect(Math.abs(k1 - (expected.handbook_k1[String(ratio)] as number))).toBeLessThan(0.0006)
    expect(Math.abs(k1 / (2 * gradient) - (expected.handbook_k2[String(ratio)] as number))).toBeLessThan(
      0.0008,
    )
  })
})

describe('PS-11', () => {
  const { title, source, inputs, expected } = check<
    { Q_m3_s: number; T_m2_s: number; aquitard_resistance_s: number; r_m: number[] },
    { drawdown: number[]; lambda_m: number; leakage_within_lambda_fraction: number }
  >('PS-11')

  it(`${title} (${source})`, () => {
    const lambda = Math.sqrt(inputs.T_m2_s * inputs.aquitard_resistance_s)
    expect(relative(lambda, expected.lambda_m)).toBeLessThan(1e-7)
    const cell = lambda / 40
    const edges = aroundACell(cell, 80, 1.08, 8 * lambda)
    const solution = solvedByBoth({
      ...sheet(inputs.T_m2_s),
      extent: extentOf(edges, edges),
      grid: { xEdges: edges, yEdges: edges },
      wells: [abstraction(0, 0, inputs.Q_m3_s, inputs.r_m[0] as number)],
      leakage: [{ name: 'Aquitard', head: 0, leakance: 1 / inputs.aquitard_resistance_s }],
      points: inputs.r_m.flatMap((r) => [
        { name: `${r} east`, x: r, y: 0 },
        { name: `${r} north-east`, x: r * Math.SQRT1_2, y: r * Math.SQRT1_2 },
      ]),
      rings: [
        {
          name: 'within lambda',
          polygon: Array.from({ length: 360 }, (_, k): Position => {
            const angle = ((k + 0.5) * Math.PI) / 180
            return [lambda * Math.cos(angle), lambda * Math.sin(angle)]
          }),
        },
      ],
    })
    inputs.r_m.forEach((r, index) => {
      if (r < 5 * cell) return
      const drawdown = expected.drawdown[index] as number
      for (const direction of ['east', 'north-east']) {
        // Close by, what is lost between centres of cells is most of it.
        expect(relative(-head(solution, `${r} ${direction}`), drawdown)).toBeLessThan(
          r < 10 * cell ? 0.0025 : 0.001,
        )
      }
    })
    expect(relative(-faceHead(solution), expected.drawdown[0] as number)).toBeLessThan(0.001)
    const leakage = solution.result.leakage[0]
    expect(relative(leakage?.inflow[0] as number, inputs.Q_m3_s)).toBeLessThan(1e-7)
    const within = (solution.result.rings[0]?.leakage[0] as number) / inputs.Q_m3_s
    expect(Math.abs(within - expected.leakage_within_lambda_fraction)).toBeLessThan(0.002)
  })
})

describe('PS-12', () => {
  const { title, source, inputs, expected } = check<
    {
      T_m2_s: number
      aquitard_resistance_s: number
      river_head_above_polder_m: number
      L_m: number
      x_m: number[]
    },
    { head_above_polder: number[]; lambda_m: number; inflow_per_m: number }
  >('PS-12')

  it(`${title} (${source})`, () => {
    const extent = { x: [0, inputs.L_m] as Position, y: [0, 10] as Position }
    const columns = Math.ceil(inputs.L_m / (expected.lambda_m / 20))
    const solution = solvedByBoth({
      ...sheet(inputs.T_m2_s),
      extent,
      grid: { columns, rows: 1 },
      leakage: [{ name: 'Polder', head: 0, leakance: 1 / inputs.aquitard_resistance_s }],
      boundaries: [fixed('River', sideLine('west', extent), inputs.river_head_above_polder_m)],
      points: inputs.x_m.map((x) => ({ name: String(x), x, y: 5 })),
    })
    inputs.x_m.forEach((x, index) => {
      const level = expected.head_above_polder[index] as number
      expect(relative(head(solution, String(x)), level)).toBeLessThan(0.0005)
    })
    expect(relative(intoModel(solution, 'River') / 10, expected.inflow_per_m)).toBeLessThan(0.0005)
    expect(
      relative(solution.result.leakage[0]?.outflow[0] as number, 10 * expected.inflow_per_m),
    ).toBeLessThan(0.0005)
  })
})

describe('PS-17', () => {
  const { title, inputs, expected } = check<
    { cells: { dx: number; dy: number }[]; Q_m3_s: number; T_m2_s: number; rw_m: number },
    { re_square_exact: number; re_rect_exact: number; well_minus_cell_head_square: number }
  >('PS-17')
  const { Q_m3_s: rate, T_m2_s: t, rw_m: radius } = inputs
  const level = ([x, y]: Position) => (rate / (2 * Math.PI * t)) * Math.log(Math.hypot(x, y))

  it.each(inputs.cells.map((cell, index) => ({ ...cell, index })))(
    `${title}: cells of $dx x $dy m`,
    ({ dx, dy, index }) => {
      // 41 and 21 cells: the well on the centre of the middle one.
      const columns = 2 * Math.round(200 / dx) + 1
      const rows = 2 * Math.round(200 / dy) + 1
      const extent = {
        x: [(-columns * dx) / 2, (columns * dx) / 2] as Position,
        y: [(-rows * dy) / 2, (rows * dy) / 2] as Position,
      }
      const solution = solvedByBoth({
        ...sheet(t),
        extent,
        grid: { columns, rows },
        wells: [abstraction(0, 0, rate, radius)],
        boundaries: heldAllRound(extent, level),
      })
      const face = faceHead(solution)
      const below = face - (solution.result.wells[0]?.cellHead[0] as number)
      const equivalent = radius * Math.exp((-below * 2 * Math.PI * t) / rate)
      const exact = [expected.re_square_exact, expected.re_rect_exact][index] as number
      expect(relative(equivalent, exact)).toBeLessThan(1e-6)
      if (index === 0) {
        // The published difference, in metres.
        expect(Math.abs(below - expected.well_minus_cell_head_square)).toBeLessThan(2e-6)
      }
      // Thiem at the well face against the head 200 m away.
      const drawdown = level([200, 0]) - level([radius, 0])
      expect(Math.abs(face - level([radius, 0])) / drawdown).toBeLessThan(0.0005)
    },
  )
})

describe('PS-18', () => {
  const { title, source, inputs, expected } = check<
    {
      Q_m3_s: number
      T_m2_s: number
      x_extent_m: number
      y_extent_m: number
      well_xy_m: Position
      points_xy_m: Position[]
    },
    { drawdown: number[]; inflow_share: Record<'south' | 'north' | 'west' | 'east', number> }
  >('PS-18')

  it(`${title} (${source})`, () => {
    const extent = { x: [0, inputs.x_extent_m] as Position, y: [0, inputs.y_extent_m] as Position }
    const solution = solvedByBoth({
      ...sheet(inputs.T_m2_s),
      extent,
      grid: { columns: inputs.x_extent_m / 5, rows: inputs.y_extent_m / 5 },
      wells: [abstraction(...inputs.well_xy_m, inputs.Q_m3_s)],
      boundaries: heldAllRound(extent, () => 0),
      points: inputs.points_xy_m.map(([x, y], index) => ({ name: String(index), x, y })),
    })
    expected.drawdown.forEach((drawdown, index) => {
      expect(Math.abs(-head(solution, String(index)) - drawdown)).toBeLessThan(0.001)
    })
    for (const [side, share] of Object.entries(expected.inflow_share)) {
      expect(Math.abs(intoModel(solution, side) / inputs.Q_m3_s - share)).toBeLessThan(0.001)
    }
  })
})

/** A strip 10 m wide held at its two ends. */
function strip(
  length: number,
  left: number,
  right: number,
  places: number[],
  ground: Pick<Parameters<typeof solvedByBoth>[0], 'materials' | 'ground'>,
): Solution {
  const extent = { x: [0, length] as Position, y: [0, 10] as Position }
  return solvedByBoth({
    ...ground,
    flow: 'unconfined',
    extent,
    grid: { columns: 100, rows: 1 },
    boundaries: [
      fixed('Left', sideLine('west', extent), left),
      fixed('Right', sideLine('east', extent), right),
    ],
    points: places.map((x) => ({ name: String(x), x, y: 5 })),
  })
}

describe('PS-19', () => {
  const { title, source, inputs, expected } = check<
    {
      K_lower: number
      lower_thickness_m: number
      K_upper: number
      h_left: number
      h_right: number
      L_m: number
    },
    { flux_per_m: number; head_at_40_80_120: number[] }
  >('PS-19')

  it(`${title} (${source})`, () => {
    const solution = strip(inputs.L_m, inputs.h_left, inputs.h_right, [40, 80, 120], {
      materials: [
        { name: 'Lower', kx: inputs.K_lower, ky: inputs.K_lower },
        { name: 'Upper', kx: inputs.K_upper, ky: inputs.K_upper },
      ],
      ground: [
        {
          layers: [
            { material: 'Upper', base: inputs.lower_thickness_m },
            { material: 'Lower', base: 0, top: inputs.lower_thickness_m },
          ],
        },
      ],
    })
    expect(relative(intoModel(solution, 'Left') / 10, expected.flux_per_m)).toBeLessThan(1e-7)
    expected.head_at_40_80_120.forEach((level, index) => {
      expect(Math.abs(head(solution, String(40 * (index + 1))) - level)).toBeLessThan(2e-4)
    })
  })
})

describe('PS-20', () => {
  const { title, source, inputs, expected } = check<
    {
      K_m_s: number
      aquifer_thickness_m: number
      h_left_m: number
      h_right_m: number
      L_m: number
      points_x_m: number[]
    },
    { flux_per_m: number; head: number[] }
  >('PS-20')

  it(`${title} (${source})`, () => {
    const solution = strip(inputs.L_m, inputs.h_left_m, inputs.h_right_m, inputs.points_x_m, {
      materials: [{ name: 'Ground', kx: inputs.K_m_s, ky: inputs.K_m_s }],
      ground: [{ material: 'Ground', base: 0, top: inputs.aquifer_thickness_m }],
    })
    expect(relative(intoModel(solution, 'Left') / 10, expected.flux_per_m)).toBeLessThan(1e-7)
    inputs.points_x_m.forEach((x, index) => {
      expect(Math.abs(head(solution, String(x)) - (expected.head[index] as number))).toBeLessThan(5e-4)
    })
  })
})
