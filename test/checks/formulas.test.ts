import { describe, expect, it } from 'vitest'
import { formulaOf } from '~/solver/formulas/compare'
import type { Boundary, Model, Position } from '~/solver/model'
import published from './published.json'

function check<Inputs, Expected>(id: string): { source: string; inputs: Inputs; expected: Expected } {
  return published.find((entry) => entry.id === id) as unknown as {
    source: string
    inputs: Inputs
    expected: Expected
  }
}

function relative(value: number, reference: number): number {
  return Math.abs(value - reference) / Math.abs(reference)
}

function plan(width: number, height: number, transmissivity: number, rest: Partial<Model>): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 's' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, width], y: [0, height] },
    grid: { columns: 10, rows: 10 },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: transmissivity, ky: transmissivity }],
    ground: [{ material: 'Sand', base: -1001, top: -1000 }],
    ...rest,
  }
}

function side(
  model: { extent: Model['extent'] },
  name: 'west' | 'east' | 'south' | 'north',
  head: number,
): Boundary {
  const { x, y } = model.extent
  const lines: Record<string, Position[]> = {
    west: [
      [x[0], y[0]],
      [x[0], y[1]],
    ],
    east: [
      [x[1], y[0]],
      [x[1], y[1]],
    ],
    south: [
      [x[0], y[0]],
      [x[1], y[0]],
    ],
    north: [
      [x[0], y[1]],
      [x[1], y[1]],
    ],
  }
  return { name, kind: 'fixed head', line: lines[name], head }
}

function held(model: Model, heads: Partial<Record<'west' | 'east' | 'south' | 'north', number>>): Model {
  const boundaries = (['west', 'east', 'south', 'north'] as const).flatMap((name) => {
    const head = heads[name]
    return head === undefined ? [] : [side(model, name, head)]
  })
  return { ...model, boundaries }
}

describe('formulas chosen for a model', () => {
  it('a well in a rectangle with all sides held (PS-18)', () => {
    const { inputs, expected } = check<
      {
        Q_m3_s: number
        T_m2_s: number
        x_extent_m: number
        y_extent_m: number
        well_xy_m: Position
        points_xy_m: Position[]
      },
      { drawdown: number[] }
    >('PS-18')
    const [x, y] = inputs.well_xy_m
    const model = held(
      plan(inputs.x_extent_m, inputs.y_extent_m, inputs.T_m2_s, {
        wells: [{ name: 'W1', x, y, kind: 'abstraction', rate: inputs.Q_m3_s }],
      }),
      { west: 10, east: 10, south: 10, north: 10 },
    )
    const formula = formulaOf(model)
    expect(formula?.extentEffect).toBe(0)
    inputs.points_xy_m.forEach(([px, py], k) => {
      expect(
        relative(10 - (formula?.headAt(px, py, 0) as number), expected.drawdown[k] as number),
      ).toBeLessThan(1e-6)
    })
  })

  it('a well in a strip between two rivers (PS-10), its closed ends far off', () => {
    const { inputs, expected } = check<
      { Q_m3_s: number; T_m2_s: number; width_m: number; well_xy_m: Position; points_xy_m: Position[] },
      { drawdown: number[] }
    >('PS-10')
    const middle = 4000
    const model = held(
      plan(inputs.width_m, 2 * middle, inputs.T_m2_s, {
        wells: [{ name: 'W1', x: inputs.well_xy_m[0], y: middle, kind: 'abstraction', rate: inputs.Q_m3_s }],
      }),
      { west: 10, east: 10 },
    )
    inputs.points_xy_m.forEach(([x, y], k) => {
      const drawdown = 10 - (formulaOf(model)?.headAt(x, y + middle, 0) as number)
      expect(relative(drawdown, expected.drawdown[k] as number)).toBeLessThan(1e-6)
    })
  })

  it('a well beside one river (PS-09) where the other sides are very far off', () => {
    const { inputs, expected } = check<
      { Q_m3_s: number; T_m2_s: number; distance_m: number; points_xy_from_river_m: Position[] },
      { drawdown: number[] }
    >('PS-09')
    const half = 30_000
    const model = held(
      plan(half, 2 * half, inputs.T_m2_s, {
        wells: [{ name: 'W1', x: inputs.distance_m, y: half, kind: 'abstraction', rate: inputs.Q_m3_s }],
      }),
      { west: 10 },
    )
    expected.drawdown.forEach((drawdown, k) => {
      const [x, y] = inputs.points_xy_from_river_m[k] as Position
      const found = 10 - (formulaOf(model)?.headAt(x, y + half, 0) as number)
      expect(Math.abs(found - drawdown)).toBeLessThan(2e-4)
    })
  })

  it('a well in leaky ground (PS-11), but only where the sides are far off', () => {
    const { inputs, expected } = check<
      { Q_m3_s: number; T_m2_s: number; aquitard_resistance_s: number; r_m: number[] },
      { drawdown: number[] }
    >('PS-11')
    const leaky = (size: number) =>
      plan(size, size, inputs.T_m2_s, {
        wells: [{ name: 'W1', x: size / 2, y: size / 2, kind: 'abstraction', rate: inputs.Q_m3_s }],
        leakage: [{ name: 'Aquitard', head: 5, leakance: 1 / inputs.aquitard_resistance_s }],
      })
    const formula = formulaOf(leaky(5000))
    inputs.r_m.forEach((r, k) => {
      const drawdown = 5 - (formula?.headAt(2500 + r, 2500, 0) as number)
      expect(relative(drawdown, expected.drawdown[k] as number)).toBeLessThan(1e-7)
    })
    expect(formulaOf(leaky(800))).toBeNull()
  })

  it('unconfined flow between two rivers with recharge (PS-02)', () => {
    const { inputs, expected } = check<
      { K_m_s: number; h_x0_m: number; h_xL_m: number; L_m: number; recharge_m_s: number },
      { head_at_x: Record<string, number> }
    >('PS-02')
    const model = held(
      plan(inputs.L_m, 100, inputs.K_m_s, {
        flow: 'unconfined',
        ground: [{ material: 'Sand', base: 0 }],
        recharge: [{ name: 'Rain', rate: inputs.recharge_m_s }],
      }),
      { west: inputs.h_x0_m, east: inputs.h_xL_m },
    )
    for (const [x, head] of Object.entries(expected.head_at_x)) {
      expect(relative(formulaOf(model)?.headAt(Number(x), 50, 0) as number, head)).toBeLessThan(1e-6)
    }
  })

  it('Thiem on a round island (PS-03)', () => {
    const { inputs, expected } = check<
      { Q_m3_s: number; T_m2_s: number; R_m: number; H_m: number; r_m: number[] },
      { head: number[] }
    >('PS-03')
    const shore = Array.from({ length: 361 }, (_, k): Position => {
      const angle = (k * Math.PI) / 180
      return [600 + inputs.R_m * Math.cos(angle), 600 + inputs.R_m * Math.sin(angle)]
    })
    const model = plan(1200, 1200, inputs.T_m2_s, {
      ground: [{ polygon: shore, material: 'Sand', base: -1001, top: -1000 }],
      boundaries: [{ name: 'Shore', kind: 'fixed head', line: shore, head: inputs.H_m }],
      wells: [{ name: 'W1', x: 600, y: 600, kind: 'abstraction', rate: inputs.Q_m3_s }],
    })
    inputs.r_m.forEach((r, k) => {
      const head = formulaOf(model)?.headAt(600 + r, 600, 0) as number
      expect(relative(head, expected.head[k] as number)).toBeLessThan(1e-6)
    })
  })

  it('Theis with two rates, one after the other, and none where the cone reaches the sides', () => {
    const growing = (size: number): Model =>
      held(
        plan(size, size, 0.01, {
          time: {
            kind: 'transient',
            initialHead: 20,
            stages: [{ duration: 3600 }, { duration: 7200 }],
          },
          materials: [{ name: 'Sand', kx: 0.01, ky: 0.01, specificStorage: 1e-4 }],
          wells: [{ name: 'W1', x: size / 2, y: size / 2, kind: 'abstraction', rate: [0.02, 0.005] }],
        }),
        { west: 20, east: 20, south: 20, north: 20 },
      )
    const formula = formulaOf(growing(20_000))
    // W(u) = 0.2194 at u = 1 and so on: by the printed table.
    const r = Math.sqrt((4 * 0.01 * 3600) / 1e-4)
    const drawdown = 20 - (formula?.headAt(10_000 + r, 10_000, 3600) as number)
    expect(relative(drawdown, (0.02 / (4 * Math.PI * 0.01)) * 0.21938393)).toBeLessThan(1e-6)
    // u = 1 for the first rate after 10,800 s and u = 1.5 for its change after 7,200 s; W(1.5) = 0.1000196.
    const far = Math.sqrt((4 * 0.01 * 10_800) / 1e-4)
    const later = 20 - (formula?.headAt(10_000 + far, 10_000, 10_800) as number)
    expect(relative(later, (0.02 * 0.21938393 - 0.015 * 0.1000196) / (4 * Math.PI * 0.01))).toBeLessThan(1e-6)
    expect(formulaOf(growing(500))).toBeNull()
  })

  it.each([
    [
      'a wall',
      {
        walls: [
          {
            name: 'Cut-off',
            line: [
              [1, 1],
              [5, 5],
            ] as Position[],
            thickness: 1,
            k: 0,
          },
        ],
      },
    ],
    [
      'two materials',
      {
        ground: [
          { material: 'Sand', base: -1001, top: -1000 },
          {
            material: 'Sand',
            base: -1,
            top: 0,
            polygon: [
              [1, 1],
              [5, 1],
              [5, 5],
            ] as Position[],
          },
        ],
      },
    ],
    [
      'recharge on a part',
      {
        recharge: [
          {
            name: 'Basin',
            rate: 1,
            polygon: [
              [1, 1],
              [5, 1],
              [5, 5],
            ] as Position[],
          },
        ],
      },
    ],
  ])('none holds beside %s', (_, change) => {
    const model = held(plan(100, 100, 1, {}), { west: 10, east: 9 })
    expect(formulaOf(model)?.name).toBe('Uniform confined flow')
    expect(formulaOf({ ...model, ...change })).toBeNull()
  })
})
