import { describe, expect, it } from 'vitest'
import type { Boundary, Position } from '~/solver/model'
import {
  aroundACell,
  between,
  check,
  extentOf,
  fixed,
  growing,
  head,
  heldAllRound,
  intoModel,
  relative,
  sheet,
  sideLine,
  solvedByBoth,
} from './plan'

/** A quarter of a circle about the origin, from the x axis to the y axis. */
function arc(radius: number): Position[] {
  return Array.from({ length: 91 }, (_, k): Position => {
    if (k === 0) return [radius, 0]
    if (k === 90) return [0, radius]
    const angle = (k * Math.PI) / 180
    return [radius * Math.cos(angle), radius * Math.sin(angle)]
  })
}

describe('DW-02', () => {
  const { title, source, inputs, expected } = check<
    { length_m: number; width_m: number },
    { exact_conformal: number; by_area: number; by_perimeter: number }
  >('DW-02')

  it(`${title}: held at a level, it draws as much as a circle of that radius (${source})`, () => {
    // A quarter of the site, no flow through its axes. Far away the heads rise as round a well.
    const [a, b] = [inputs.length_m / 2, inputs.width_m / 2]
    const far = 250
    const edges = growing(0.5, 60, 1.08, far)
    const extent = extentOf(edges, edges)
    const reach = extent.x[1]
    const t = 0.001
    const level = ([x, y]: Position) => Math.log(Math.hypot(x, y) / expected.exact_conformal)
    const solution = solvedByBoth({
      ...sheet(t),
      ground: [
        {
          material: 'Ground',
          polygon: [
            [a, 0],
            [reach, 0],
            [reach, reach],
            [0, reach],
            [0, b],
            [a, b],
          ],
          base: -1001,
          top: -1000,
        },
      ],
      extent,
      grid: { xEdges: edges, yEdges: edges },
      boundaries: [
        fixed(
          'Excavation',
          [
            [a, 0],
            [a, b],
            [0, b],
          ],
          0,
        ),
        ...(['east', 'north'] as const).map((side) => {
          const line = sideLine(side, extent, 200)
          return fixed(side, line, line.map(level))
        }),
      ],
    })
    const inflow = -4 * intoModel(solution, 'Excavation')
    // The heads held far away over the rise in them that this inflow makes for each e times the distance.
    const ratio = Math.exp(Math.log(reach / expected.exact_conformal) * ((2 * Math.PI * t) / inflow))
    const radius = reach / ratio
    expect(relative(radius, expected.exact_conformal)).toBeLessThan(0.005)
    expect(relative(radius, expected.by_area)).toBeGreaterThan(0.05)
    expect(relative(radius, expected.by_perimeter)).toBeGreaterThan(0.05)
  })
})

describe.each(['DW-04', 'DW-06'] as const)('%s', (id) => {
  const { title, source, inputs, expected } = check<
    {
      K_m_s: number
      H_m: number
      h_m: number
      L0_m: number
      slot_length_m?: number
      confined_thickness_m?: number
    },
    {
      unconfined_one_side_m3_s?: number
      unconfined_two_sides_m3_s?: number
      confined_one_side_m3_s?: number
      confined_two_sides_m3_s?: number
      flow_per_m_one_side?: number
    }
  >(id)
  const length = inputs.slot_length_m ?? 1
  const flow = (unconfined: boolean, sides: 1 | 2) => {
    const extent = {
      x: [sides === 2 ? -inputs.L0_m : 0, inputs.L0_m] as Position,
      y: [0, length] as Position,
    }
    const far: Boundary[] = [fixed('East', sideLine('east', extent), inputs.H_m)]
    if (sides === 2) far.push(fixed('West', sideLine('west', extent), inputs.H_m))
    const material = { name: 'Ground', kx: inputs.K_m_s, ky: inputs.K_m_s }
    const sheetOf = (base: number) => ({
      material: 'Ground',
      base,
      ...(unconfined ? {} : { top: base + (inputs.confined_thickness_m ?? 1) }),
    })
    // The slot is one metre wide, cut out of the ground: its flanks hold its level.
    const ground =
      sides === 1
        ? [sheetOf(unconfined ? 0 : -1)]
        : [
            { ...sheetOf(unconfined ? 0 : -1), polygon: boxed(-inputs.L0_m - 0.5, -0.5, length) },
            { ...sheetOf(unconfined ? 0 : -1), polygon: boxed(0.5, inputs.L0_m + 0.5, length) },
          ]
    const wide = sides === 2 ? 0.5 : 0
    const solution = solvedByBoth({
      flow: unconfined ? 'unconfined' : 'confined',
      materials: [material],
      ground,
      extent: { x: [extent.x[0] - wide, extent.x[1] + wide], y: extent.y },
      grid: sides === 2 ? { columns: 2 * inputs.L0_m + 1, rows: 2 } : { columns: inputs.L0_m, rows: 2 },
      boundaries: [
        ...far.map((boundary) => ({
          ...boundary,
          line: boundary.line?.map(([x, y]): Position => [x + Math.sign(x) * wide, y]),
        })),
        fixed('Slot', between([wide, 0], [wide, length]), inputs.h_m),
        ...(sides === 2 ? [fixed('Far flank', between([-wide, 0], [-wide, length]), inputs.h_m)] : []),
      ],
    })
    return -intoModel(solution, 'Slot') - (sides === 2 ? intoModel(solution, 'Far flank') : 0)
  }

  it(`${title} (${source})`, () => {
    if (expected.flow_per_m_one_side !== undefined) {
      expect(relative(flow(true, 1), expected.flow_per_m_one_side)).toBeLessThan(1e-7)
      return
    }
    expect(relative(flow(true, 1), expected.unconfined_one_side_m3_s as number)).toBeLessThan(1e-7)
    expect(relative(flow(true, 2), expected.unconfined_two_sides_m3_s as number)).toBeLessThan(1e-7)
    expect(relative(flow(false, 1), expected.confined_one_side_m3_s as number)).toBeLessThan(1e-7)
    expect(relative(flow(false, 2), expected.confined_two_sides_m3_s as number)).toBeLessThan(1e-7)
  })
})

function boxed(from: number, to: number, width: number): Position[] {
  return [
    [from, 0],
    [to, 0],
    [to, width],
    [from, width],
  ]
}

describe('DW-05', () => {
  const { title, source, inputs, expected } = check<
    { K_m_s: number; H_m: number; R_m: number; Q_each_m3_s: number; wells_xy: Position[]; rw_m: number },
    { head_at_centre: number; head_at_corner_inside: number; head_at_well_face_4th: number }
  >('DW-05')

  it(`${title} (${source})`, () => {
    const { K_m_s: k, Q_each_m3_s: rate, H_m: outer, R_m: reach } = inputs
    const level = ([x, y]: Position) =>
      Math.sqrt(
        inputs.wells_xy.reduce(
          (square, [wx, wy]) =>
            square - (rate / (Math.PI * k)) * Math.log(reach / Math.hypot(x - wx, y - wy)),
          outer ** 2,
        ),
      )
    // Wells and points stand on centres of half-metre cells.
    const edges = aroundACell(0.5, 40, 1.1, 60)
    const extent = extentOf(edges, edges)
    const solution = solvedByBoth({
      flow: 'unconfined',
      materials: [{ name: 'Ground', kx: k, ky: k }],
      ground: [{ material: 'Ground', base: 0 }],
      extent,
      grid: { xEdges: edges, yEdges: edges },
      wells: inputs.wells_xy.map(([x, y], index) => ({
        name: `W${index + 1}`,
        x,
        y,
        kind: 'abstraction',
        rate,
        radius: inputs.rw_m,
      })),
      boundaries: heldAllRound(extent, level),
      points: [
        { name: 'centre', x: 0, y: 0 },
        { name: 'corner', x: 14, y: 9 },
      ],
    })
    const within = (value: number, exact: number) => Math.abs(value - exact) / (outer - exact)
    expect(within(head(solution, 'centre'), expected.head_at_centre)).toBeLessThan(5e-4)
    expect(within(head(solution, 'corner'), expected.head_at_corner_inside)).toBeLessThan(0.001)
    const face = solution.result.wells[3]?.wellHead[0] as number
    expect(within(face, expected.head_at_well_face_4th)).toBeLessThan(0.001)
  })
})

describe('DW-09', () => {
  const { title, source, inputs, expected } = check<
    { K_m_s: number; H_m: number; drawdown_m: number },
    { re_m: number; R0_m: number; Q_with_R0_plus_re_m3_s: number; Q_with_R0_only_m3_s: number }
  >('DW-09')

  it.each([
    ['measured from its edge', expected.R0_m + expected.re_m, expected.Q_with_R0_plus_re_m3_s],
    ['measured from its centre', expected.R0_m, expected.Q_with_R0_only_m3_s],
  ] as const)(`${title}: the radius of influence %s (${source})`, (_, far, inflow) => {
    const edges = growing(0.5, 60, 1.05, far)
    const solution = solvedByBoth({
      flow: 'unconfined',
      materials: [{ name: 'Ground', kx: inputs.K_m_s, ky: inputs.K_m_s }],
      ground: [
        {
          material: 'Ground',
          polygon: [...arc(far), ...arc(expected.re_m).reverse()],
          base: 0,
        },
      ],
      extent: extentOf(edges, edges),
      grid: { xEdges: edges, yEdges: edges },
      boundaries: [
        fixed('Excavation', arc(expected.re_m), inputs.H_m - inputs.drawdown_m),
        fixed('Far', arc(far), inputs.H_m),
      ],
    })
    expect(relative(-4 * intoModel(solution, 'Excavation'), inflow)).toBeLessThan(0.005)
  })
})
