import { describe, expect, it } from 'vitest'
import type { Position } from '~/solver/model'
import {
  abstraction,
  check,
  circle,
  extentOf,
  fixed,
  growing,
  head,
  intoModel,
  relative,
  sideLine,
  solved,
  solvedByBoth,
  stagesTo,
} from './plan'

const perDay = 1e-3 / 86400

describe('CO-07', () => {
  interface Ground {
    T_m2_s: number
    S: number
  }
  const { title, source, inputs, expected } = check<
    {
      Q_m3_s: number
      patch: Ground & { radius_m: number }
      outside: Ground
      r_m: number[]
      t_s: number[]
    },
    { drawdown: Record<string, number[]> }
  >('CO-07')

  it(`${title} (${source})`, () => {
    // A quarter of the site: the well in its corner gives a quarter of its rate.
    const edges = growing(10, 16, 1.15, 9000)
    const material = (name: string, { T_m2_s: t, S }: Ground) => ({ name, kx: t, ky: t, specificStorage: S })
    const layer = { base: -1001, top: -1000 }
    const solution = solved({
      materials: [material('Outside', inputs.outside), material('Patch', inputs.patch)],
      ground: [
        { material: 'Outside', ...layer },
        { material: 'Patch', polygon: circle(inputs.patch.radius_m), ...layer },
      ],
      extent: extentOf(edges, edges),
      grid: { xEdges: edges, yEdges: edges },
      time: { kind: 'transient', initialHead: 0, stages: stagesTo(inputs.t_s, 20, 2 ** (1 / 8)) },
      wells: [abstraction(0, 0, inputs.Q_m3_s / 4)],
      points: inputs.r_m.map((r) => ({ name: String(r), x: r, y: 0 })),
    })
    inputs.t_s.forEach((time, at) => {
      inputs.r_m.forEach((r, index) => {
        const drawdown = expected.drawdown[`${time}.0`]?.[index] as number
        const error = Math.abs(-head(solution, String(r), at) - drawdown)
        if (r < inputs.patch.radius_m) expect(error / drawdown).toBeLessThan(0.02)
        else expect(error).toBeLessThan(Math.max(0.01 * drawdown, 0.005))
      })
    })
  })
})

describe('CO-10', () => {
  const { title, source, inputs, expected } = check<
    {
      extent_m: { x: Position; y: Position }
      thickness_m: number
      background: { K_m_s: number }
      zones: { K_m_s: number; polygon: Position[] }[]
      boundaries: { polyline: Position[]; head_m: number[] }[]
      recharge: { mm_per_d: number; polygon: Position[] }[]
      walls: { polyline: Position[] }[]
      wells: { name: string; x: number; y: number; abstraction_m3_s: number; radius_m: number }[]
      points: Record<string, Position>
    },
    { values: Record<string, number> }
  >('CO-10')

  it(`${title} (${source})`, () => {
    const { extent_m: extent, thickness_m: thickness } = inputs
    const layer = { base: -100, top: thickness - 100 }
    const solution = solvedByBoth({
      extent,
      grid: { columns: extent.x[1] / 5, rows: extent.y[1] / 5 },
      materials: [
        { name: 'Background', kx: inputs.background.K_m_s, ky: inputs.background.K_m_s },
        ...inputs.zones.map(({ K_m_s: k }, index) => ({ name: `Zone ${index}`, kx: k, ky: k })),
      ],
      ground: [
        { material: 'Background', ...layer },
        ...inputs.zones.map(({ polygon }, index) => ({ material: `Zone ${index}`, polygon, ...layer })),
      ],
      boundaries: inputs.boundaries
        .filter((boundary) => boundary.polyline)
        .map(({ polyline, head_m: level }, index) => fixed(index === 0 ? 'west' : 'east', polyline, level)),
      recharge: inputs.recharge.map(({ mm_per_d: rate, polygon }, index) => ({
        name: `Field ${index}`,
        polygon,
        rate: rate * perDay,
      })),
      walls: inputs.walls.map(({ polyline }, index) => ({
        name: `Wall ${index}`,
        line: polyline,
        thickness: 1,
        k: 0,
      })),
      wells: inputs.wells.map(({ name, x, y, abstraction_m3_s: rate, radius_m: radius }) => ({
        name,
        x,
        y,
        kind: 'abstraction',
        rate,
        radius,
      })),
      points: Object.entries(inputs.points).map(([name, [x, y]]) => ({ name, x, y })),
    })
    const { values } = expected
    for (const name of Object.keys(inputs.points)) {
      expect(Math.abs(head(solution, name) - (values[name] as number))).toBeLessThan(2e-4)
    }
    for (const { name, wellHead } of solution.result.wells) {
      expect(Math.abs((wellHead[0] as number) - (values[`head_in_${name}`] as number))).toBeLessThan(0.001)
    }
    for (const side of ['west', 'east']) {
      expect(relative(intoModel(solution, side), values[`inflow_${side}`] as number)).toBeLessThan(1e-4)
    }
  })
})

describe('CO-11', () => {
  const { title, source, inputs, expected } = check<
    {
      extent_m: { x: Position; y: Position }
      base_m: number
      background: { K_m_s: number }
      boundaries: { head_m: number[] }[]
      recharge: { mm_per_d: number; polygon: Position[] | string }[]
      wells: { x: number; y: number; abstraction_m3_s: number; radius_m: number }[]
      points: Record<string, Position>
    },
    { values: Record<string, number> }
  >('CO-11')

  it(`${title} (${source})`, () => {
    const { extent_m: extent } = inputs
    const [everywhere, field] = inputs.recharge as [(typeof inputs.recharge)[0], (typeof inputs.recharge)[0]]
    const [well] = inputs.wells as [(typeof inputs.wells)[0]]
    const level = (index: number) => inputs.boundaries[index]?.head_m as number[]
    const solution = solvedByBoth({
      flow: 'unconfined',
      extent,
      grid: { columns: extent.x[1] / 5, rows: extent.y[1] / 5 },
      materials: [{ name: 'Ground', kx: inputs.background.K_m_s, ky: inputs.background.K_m_s }],
      ground: [{ material: 'Ground', base: inputs.base_m }],
      boundaries: [
        fixed('west', sideLine('west', extent), level(0)),
        fixed('east', sideLine('east', extent), level(1)),
      ],
      // Entries add up, so the field brings what it has more than its surroundings.
      recharge: [
        { name: 'Everywhere', rate: everywhere.mm_per_d * perDay },
        {
          name: 'Field',
          polygon: field.polygon as Position[],
          rate: (field.mm_per_d - everywhere.mm_per_d) * perDay,
        },
      ],
      wells: [abstraction(well.x, well.y, well.abstraction_m3_s, well.radius_m)],
      points: Object.entries(inputs.points).map(([name, [x, y]]) => ({ name, x, y })),
    })
    const { values } = expected
    for (const name of Object.keys(inputs.points)) {
      expect(Math.abs(head(solution, name) - (values[name] as number))).toBeLessThan(2e-4)
    }
    const face = solution.result.wells[0]?.wellHead[0] as number
    expect(Math.abs(face - (values.head_in_well as number))).toBeLessThan(2e-4)
    for (const side of ['west', 'east']) {
      expect(relative(intoModel(solution, side), values[`inflow_${side}`] as number)).toBeLessThan(1e-6)
    }
  })
})
