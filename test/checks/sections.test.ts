import { describe, expect, it } from 'vitest'
import type { Boundary, Model, Position, Wall } from '~/solver/model'
import type { GradientResult } from '~/solver/result'
import { type Solution, solveModel } from '~/solver/solve'
import { check, fixed, head, intoModel, relative, solvedByBoth } from './plan'

/** Edges that are `fine` apart from `from` to `to` and grow by 15 % beyond, to `low` and `high`. */
function edges(low: number, from: number, to: number, high: number, fine: number): number[] {
  const count = Math.round((to - from) / fine)
  const middle = Array.from({ length: count + 1 }, (_, k) => from + ((to - from) * k) / count)
  const beyond = (start: number, end: number): number[] => {
    const steps: number[] = []
    let size = fine
    for (let place = start; Math.abs(end - place) > 1e-9; ) {
      size *= 1.15
      place = Math.abs(end - place) < 1.6 * size ? end : place + Math.sign(end - start) * size
      steps.push(place)
    }
    return steps
  }
  return [...beyond(from, low).reverse(), ...middle, ...beyond(to, high)]
}

function level(from: number, to: number, y: number): Position[] {
  return [
    [from, y],
    [to, y],
  ]
}

function upright(x: number, from: number, to: number): Position[] {
  return [
    [x, from],
    [x, to],
  ]
}

function pile(name: string, x: number, toe: number, top: number): Wall {
  return { name, line: upright(x, toe, top), thickness: 0.5, k: 0 }
}

function gradientAt({ result }: Solution, name: string): GradientResult {
  const found = result.gradients?.find((row) => row.name === name)
  if (!found) throw new Error(`no gradient at ${name}`)
  return found
}

interface Weir {
  depth: number
  reach: number
  drop: number
  kx?: number
  ky?: number
  floor: [number, number]
  /** Where piles stand, and how deep each is. */
  piles: [x: number, depth: number][]
  grid: Model['grid']
  points?: Model['points']
}

/** Water held back over level ground by an impervious floor with piles; tailwater at ground level. */
function weir({ depth, reach, drop, kx = 1e-5, ky = kx, floor, piles, grid, points }: Weir): Solution {
  const [west, east] = floor
  return solvedByBoth({
    kind: 'section',
    flow: 'saturated',
    extent: { x: [-reach, reach], y: [0, depth] },
    grid,
    materials: [{ name: 'Sand', kx, ky }],
    ground: [{ material: 'Sand' }],
    boundaries: [
      fixed('Upstream bed', level(-reach, west, depth), depth + drop),
      fixed('Downstream bed', level(east, reach, depth), depth),
    ],
    walls: piles.map(([x, embedment], index) => pile(`Pile ${index}`, x, depth - embedment, depth)),
    ...(points === undefined ? {} : { points }),
  })
}

const withKey = <Value>(record: Record<string, Value>, key: number): Value => {
  const found = Object.keys(record).find((name) => Number(name) === key)
  return record[found ?? ''] as Value
}

describe('SE-01', () => {
  const { title, source, inputs, expected } = check<
    { head_difference_m: number; layer_depth_m: number; pile_depth_m: number[] },
    { exit_gradient_at_wall: Record<string, number> }
  >('SE-01')
  const depth = inputs.layer_depth_m

  it.each(inputs.pile_depth_m)(
    `${title}, %d m deep: exit gradient at the wall to a hundredth (${source})`,
    (embedment) => {
      const solution = weir({
        depth,
        reach: 5 * depth,
        drop: inputs.head_difference_m,
        floor: [0, 0],
        piles: [[0, embedment]],
        grid: {
          xEdges: edges(-5 * depth, -depth, depth, 5 * depth, depth / 48),
          yEdges: Array.from({ length: 49 }, (_, k) => (k * depth) / 48),
        },
      })
      const row = gradientAt(solution, 'Downstream bed')
      expect(relative(row.localMaximum, withKey(expected.exit_gradient_at_wall, embedment))).toBeLessThan(
        0.01,
      )
      expect(row.singular).toBe(false)
      expect(row.overDepth).toBeCloseTo(embedment, 9)
      expect(Math.abs(row.at[0])).toBeLessThan(depth / 40)
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
    { exit_gradient_at_wall: number }
  >('SE-02')

  it(`${title}: exit gradient at the wall within 2 % (${source})`, () => {
    const depth = inputs.layer_depth_m
    const solution = weir({
      depth,
      reach: 10 * depth,
      drop: inputs.head_difference_m,
      kx: inputs.kh_m_s,
      ky: inputs.kv_m_s,
      floor: [0, 0],
      piles: [[0, inputs.pile_depth_m]],
      grid: {
        xEdges: edges(-10 * depth, -depth, depth, 10 * depth, depth / 40),
        yEdges: Array.from({ length: 41 }, (_, k) => (k * depth) / 40),
      },
    })
    const row = gradientAt(solution, 'Downstream bed')
    expect(relative(row.localMaximum, expected.exit_gradient_at_wall)).toBeLessThan(0.02)
  })
})

describe('SE-03', () => {
  const { title, source, inputs, expected } = check<
    { head_difference_m: number; pile_depth_m: number; depths_m: number[] },
    { exit_gradient: number; head_upstream_face: number[]; head_downstream_face: number[] }
  >('SE-03')

  it(`${title}: exit gradient within 1 %, heads within 1 % of the drop (${source})`, () => {
    const s = inputs.pile_depth_m
    const depth = 20 * s
    const inGround = inputs.depths_m.filter((z) => z > 0 && z < s)
    const solution = weir({
      depth,
      reach: 20 * s,
      drop: inputs.head_difference_m,
      floor: [0, 0],
      piles: [[0, s]],
      grid: {
        xEdges: edges(-20 * s, -1.5 * s, 1.5 * s, 20 * s, s / 20),
        yEdges: edges(0, depth - 2 * s, depth, depth, s / 20),
      },
      points: inGround.flatMap((z) => [
        { name: `up ${z}`, x: 0, y: depth - z, side: 'left' as const },
        { name: `down ${z}`, x: 0, y: depth - z, side: 'right' as const },
      ]),
    })
    const row = gradientAt(solution, 'Downstream bed')
    expect(relative(row.localMaximum, expected.exit_gradient)).toBeLessThan(0.01)
    for (const z of inGround) {
      const index = inputs.depths_m.indexOf(z)
      const [up, down] = [expected.head_upstream_face[index], expected.head_downstream_face[index]]
      const allowed = 0.01 * inputs.head_difference_m
      expect(Math.abs(head(solution, `up ${z}`) - depth - (up as number))).toBeLessThan(allowed)
      expect(Math.abs(head(solution, `down ${z}`) - depth - (down as number))).toBeLessThan(allowed)
    }
  })
})

describe('SE-04', () => {
  const { title, source, inputs, expected } = check<
    { floor_length_m: number; cutoff_depth_m: number; head_m: number },
    { phi_E_percent: number; phi_D_percent: number; exit_gradient: number }
  >('SE-04')

  it(`${title}: potentials within 1 %, exit gradient within 2 % (${source})`, () => {
    const { floor_length_m: b, cutoff_depth_m: d, head_m: drop } = inputs
    const depth = 6 * b
    const solution = weir({
      depth,
      reach: 6 * b,
      drop,
      floor: [-b, 0],
      piles: [[0, d]],
      grid: {
        xEdges: edges(-6 * b, -1.2 * b, 1.5 * d, 6 * b, d / 20),
        yEdges: edges(0, depth - 2 * d, depth, depth, d / 20),
      },
      points: [
        { name: 'E', x: 0, y: depth - 1e-3, side: 'left' },
        { name: 'D', x: 0, y: depth - d - 1e-3 },
      ],
    })
    const potential = (name: string) => (100 * (head(solution, name) - depth)) / drop
    expect(Math.abs(potential('E') - expected.phi_E_percent)).toBeLessThan(1)
    expect(Math.abs(potential('D') - expected.phi_D_percent)).toBeLessThan(1)
    const row = gradientAt(solution, 'Downstream bed')
    expect(relative(row.localMaximum, expected.exit_gradient)).toBeLessThan(0.02)
    expect(row.singular).toBe(false)
  })
})

describe('SE-05', () => {
  const { title, source, inputs, expected } = check<
    { upstream_length_m: number; downstream_length_m: number; pile_depth_m: number },
    { phi_percent: { E: number; D: number; C: number } }
  >('SE-05')

  it(`${title}: potentials within 1 % (${source})`, () => {
    const { upstream_length_m: up, downstream_length_m: down, pile_depth_m: d } = inputs
    const depth = 150
    const solution = weir({
      depth,
      reach: 180,
      drop: 1,
      floor: [-up, down],
      piles: [[0, d]],
      grid: {
        xEdges: edges(-180, -up - 3, down + 3, 180, 0.25),
        yEdges: edges(0, depth - 2 * d, depth, depth, 0.25),
      },
      points: [
        { name: 'E', x: 0, y: depth - 1e-3, side: 'left' },
        { name: 'D', x: 0, y: depth - d - 1e-3 },
        { name: 'C', x: 0, y: depth - 1e-3, side: 'right' },
      ],
    })
    for (const name of ['E', 'D', 'C'] as const) {
      expect(Math.abs(100 * (head(solution, name) - depth) - expected.phi_percent[name])).toBeLessThan(1)
    }
    // The floor's end, without a pile, is where the gradient has no limit.
    expect(gradientAt(solution, 'Downstream bed').singular).toBe(true)
  })
})

describe('SE-06', () => {
  const { title, source, inputs, expected } = check<
    {
      floor_width_m: number
      layer_depth_m: number
      head_m: number
      k_m_s: number
      x_from_middle_m: number[]
    },
    { form_factor: number; uplift_head_infinite_depth: number[] }
  >('SE-06')
  const b = inputs.floor_width_m

  it(`${title}: flow within 1 % (${source})`, () => {
    const depth = inputs.layer_depth_m
    const solution = weir({
      depth,
      reach: 5 * depth,
      drop: inputs.head_m,
      kx: inputs.k_m_s,
      floor: [-b / 2, b / 2],
      piles: [],
      grid: {
        xEdges: edges(-5 * depth, -depth, depth, 5 * depth, depth / 120),
        yEdges: edges(0, depth / 2, depth, depth, depth / 120),
      },
    })
    const factor = intoModel(solution, 'Upstream bed') / (inputs.k_m_s * inputs.head_m)
    expect(relative(factor, expected.form_factor)).toBeLessThan(0.01)
  })

  it('uplift under the floor on deep ground within 1 % of the drop', () => {
    const depth = 20 * b
    const solution = weir({
      depth,
      reach: 20 * b,
      drop: inputs.head_m,
      floor: [-b / 2, b / 2],
      piles: [],
      grid: {
        xEdges: edges(-20 * b, -b, b, 20 * b, b / 60),
        yEdges: edges(0, depth - b / 2, depth, depth, b / 60),
      },
      points: inputs.x_from_middle_m.map((x) => ({ name: `${x}`, x, y: depth })),
    })
    inputs.x_from_middle_m.forEach((x, index) => {
      const uplift = expected.uplift_head_infinite_depth[index] as number
      expect(Math.abs(head(solution, `${x}`) - depth - uplift)).toBeLessThan(0.01 * inputs.head_m)
    })
  })
})

describe('SE-07', () => {
  const { title, source, inputs, expected } = check<
    { floor_length_m: number; cutoff_depth_m: number; head_m: number },
    { phi_percent: Record<string, number>; exit_gradient: number }
  >('SE-07')

  it(`${title}: potentials within 1 %, exit gradient within 2 % (${source})`, () => {
    const { floor_length_m: b, cutoff_depth_m: d, head_m: drop } = inputs
    const depth = 6 * b
    const solution = weir({
      depth,
      reach: 5 * b,
      drop,
      floor: [-b / 2, b / 2],
      piles: [
        [-b / 2, d],
        [b / 2, d],
      ],
      grid: {
        xEdges: edges(-5 * b, -b / 2 - d, b / 2 + d, 5 * b, d / 20),
        yEdges: edges(0, depth - 2 * d, depth, depth, d / 20),
      },
      points: [
        { name: 'phi_inner_corner_downstream', x: b / 2, y: depth - 1e-3, side: 'left' },
        { name: 'phi_tip_downstream', x: b / 2, y: depth - d - 1e-3 },
        { name: 'phi_inner_corner_upstream', x: -b / 2, y: depth - 1e-3, side: 'right' },
        { name: 'phi_tip_upstream', x: -b / 2, y: depth - d - 1e-3 },
      ],
    })
    for (const [name, percent] of Object.entries(expected.phi_percent)) {
      expect(Math.abs((100 * (head(solution, name) - depth)) / drop - percent)).toBeLessThan(1)
    }
    const row = gradientAt(solution, 'Downstream bed')
    expect(relative(row.localMaximum, expected.exit_gradient)).toBeLessThan(0.02)
  })
})

describe('SE-08', () => {
  const { title, source, inputs, expected } = check<
    {
      k_m_s: number
      wall_depth_below_ground_m: number
      excavation_depth_m: number
      impervious_base_depth_m: number
      half_width_m: number
      head_outside_above_excavation_floor_m: number
    },
    {
      inflow_per_m_both_sides: number
      exit_gradient_at_wall: number
      exit_gradient_at_centre: number
      head_at_wall_tip_above_floor: number
      mean_head_at_tip_level_over_half_embedment: number
      terzaghi_average_gradient: number
    }
  >('SE-08')
  const depth = inputs.impervious_base_depth_m
  const half = inputs.half_width_m
  const floor = depth - inputs.excavation_depth_m
  const toe = depth - inputs.wall_depth_below_ground_m
  const reach = half + 5 * depth
  const size = depth / 72

  it(`${title}: half of it, inflow and gradients within 1 % (${source})`, () => {
    const solution = solvedByBoth({
      kind: 'section',
      flow: 'saturated',
      extent: { x: [0, reach], y: [0, depth] },
      grid: {
        xEdges: edges(0, 0, 3 * half, reach, size),
        yEdges: Array.from({ length: 73 }, (_, k) => k * size),
      },
      materials: [{ name: 'Sand', kx: inputs.k_m_s, ky: inputs.k_m_s }],
      ground: [
        {
          material: 'Sand',
          polygon: [
            [0, 0],
            [reach, 0],
            [reach, depth],
            [half, depth],
            [half, floor],
            [0, floor],
          ],
        },
      ],
      boundaries: [
        fixed('Outside', level(half, reach, depth), floor + inputs.head_outside_above_excavation_floor_m),
        fixed('Dig level', level(0, half, floor), floor),
      ],
      walls: [pile('Wall', half, toe, depth)],
      points: [
        { name: 'tip', x: half, y: toe - 1e-3 },
        { name: 'centre', x: 0, y: floor - size / 2 },
      ],
      rings: [{ name: 'Soil plug', polygon: [...level(0, half, toe), ...level(half, 0, floor)] }],
    })
    expect(relative(intoModel(solution, 'Outside'), expected.inflow_per_m_both_sides / 2)).toBeLessThan(0.005)
    const row = gradientAt(solution, 'Dig level')
    expect(relative(row.localMaximum, expected.exit_gradient_at_wall)).toBeLessThan(0.01)
    expect(row.at[0]).toBeCloseTo(half - size / 2, 9)
    expect(row.overDepth).toBeCloseTo(floor - toe, 9)
    expect(relative(row.mean, expected.terzaghi_average_gradient)).toBeLessThan(0.01)
    expect(
      relative(row.mean * row.overDepth, expected.mean_head_at_tip_level_over_half_embedment),
    ).toBeLessThan(0.01)
    expect(row.singular).toBe(false)
    expect(
      relative((head(solution, 'centre') - floor) / (size / 2), expected.exit_gradient_at_centre),
    ).toBeLessThan(0.01)
    expect(Math.abs(head(solution, 'tip') - floor - expected.head_at_wall_tip_above_floor)).toBeLessThan(0.05)
    const ring = solution.result.rings[0]
    expect(relative(ring?.through[0] as number, expected.inflow_per_m_both_sides / 2)).toBeLessThan(0.005)
  })
})

describe('SE-09', () => {
  const { title, source, inputs, expected } = check<
    { length_m: number; depth_m: number; slope: number; k_m_s: number; points_x_z_from_base: Position[] },
    { head: number[]; flow_through_midline_per_m: number }
  >('SE-09')

  it(`${title}: heads within 0.01 m (${source})`, () => {
    const { length_m: length, depth_m: depth, slope, k_m_s: k } = inputs
    const solution = solvedByBoth({
      kind: 'section',
      flow: 'saturated',
      extent: { x: [0, length], y: [0, depth] },
      grid: { columns: 100, rows: 50 },
      materials: [{ name: 'Rock', kx: k, ky: k }],
      ground: [{ material: 'Rock' }],
      boundaries: [fixed('Water table', level(0, length, depth), [depth, depth + slope * length])],
      points: inputs.points_x_z_from_base.map(([x, y], index) => ({ name: `${index}`, x, y })),
      lines: [{ name: 'Middle', line: upright(length / 2, 0, depth) }],
    })
    expected.head.forEach((value, index) => {
      expect(Math.abs(head(solution, `${index}`) - value)).toBeLessThan(0.01)
    })
    // From the high east to the low west: to the left of a line that runs up.
    const discharge = solution.result.lines[0]?.discharge[0] as number
    expect(relative(discharge, expected.flow_through_midline_per_m)).toBeLessThan(0.005)
  })
})

interface Dam {
  height: number
  length: number
  tailwater: number
  k: number
  columns: number
  rows: number
}

function dam({ height, length, tailwater, k, columns, rows }: Dam): Model {
  const downstream: Boundary[] =
    tailwater > 0 ? [fixed('Tailwater', upright(length, 0, tailwater), tailwater)] : []
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 's' },
    kind: 'section',
    flow: 'free surface',
    time: { kind: 'steady' },
    extent: { x: [0, length], y: [0, height] },
    grid: { columns, rows },
    materials: [{ name: 'Fill', kx: k, ky: k }],
    ground: [{ material: 'Fill' }],
    boundaries: [
      fixed('Headwater', upright(0, 0, height), height),
      ...downstream,
      { name: 'Downstream face', kind: 'seepage face', line: upright(length, tailwater, height) },
    ],
  }
}

function exitElevation({ result }: Solution): number {
  return result.seepageFaces?.find(({ name }) => name === 'Downstream face')?.exitElevation ?? Number.NaN
}

function surfaceAt({ result }: Solution, x: number): number {
  const surface = result.freeSurface ?? []
  const after = surface.findIndex((point) => point.x >= x)
  const [a, b] = [surface[after - 1], surface[after]]
  if (!a || !b) throw new Error(`no free surface at ${x}`)
  return a.elevation + ((b.elevation - a.elevation) * (x - a.x)) / (b.x - a.x)
}

describe.each([
  { id: 'SE-10', columns: 40, rows: 60 },
  { id: 'SE-10b', columns: 40, rows: 40 },
  { id: 'SE-10c', columns: 40, rows: 80 },
])('$id', ({ id, columns, rows }) => {
  const { title, source, inputs, expected } = check<
    { k_m_s: number; headwater_m: number; length?: number; length_m?: number; tailwater_m: number },
    { flow_per_m: number; exit_point_height_above_base: number; free_surface_at_x: Record<string, number> }
  >(id)
  const of = (factor: number): Dam => ({
    height: inputs.headwater_m,
    length: (inputs.length ?? inputs.length_m) as number,
    tailwater: inputs.tailwater_m,
    k: inputs.k_m_s,
    columns: factor * columns,
    rows: factor * rows,
  })
  /** Steep at the exit, so that a cell along and a cell up are two things: a quarter of a cell's height. */
  const expectDam = (solution: Solution, exitWithin: number, surfaceWithin: number) => {
    expect(relative(intoModel(solution, 'Headwater'), expected.flow_per_m)).toBeLessThan(1e-8)
    expect(Math.abs(exitElevation(solution) - expected.exit_point_height_above_base)).toBeLessThan(exitWithin)
    for (const [x, elevation] of Object.entries(expected.free_surface_at_x)) {
      expect(Math.abs(surfaceAt(solution, Number(x)) - elevation)).toBeLessThan(surfaceWithin)
    }
  }

  it(`${title}: discharge exact, exit and surface within a quarter of a cell (${source})`, () => {
    const cell = inputs.headwater_m / rows
    expectDam(solvedByBoth(dam(of(1))), 0.25 * cell, 0.1 * cell)
  })

  it('at 80 cells across: the exit within a tenth of a cell or so', () => {
    const cell = inputs.headwater_m / (2 * rows)
    const solution = solveModel(dam(of(2)))
    expect(solution.result.converged).toBe(true)
    expectDam(solution, id === 'SE-10' ? 0.05 : 0.25 * cell, 0.1 * cell)
  })
})

describe('SE-11', () => {
  const { title, source, inputs, expected } = check<{ L_over_H: number[] }, { exit_over_H: number[] }>(
    'SE-11',
  )

  it.each(inputs.L_over_H.map((ratio, index) => [ratio, expected.exit_over_H[index] as number]))(
    `${title}, L / H = %d: within a quarter of a cell (${source})`,
    (ratio, exit) => {
      const columns = 40
      const rows = Math.round(columns / ratio)
      const solution = solveModel(dam({ height: 1, length: ratio, tailwater: 0, k: 1e-5, columns, rows }))
      expect(solution.result.converged).toBe(true)
      expect(relative(intoModel(solution, 'Headwater'), 1e-5 / (2 * ratio))).toBeLessThan(1e-8)
      expect(Math.abs(exitElevation(solution) - exit)).toBeLessThan(0.25 / rows)
    },
  )
})

describe('PT-15', () => {
  const { title, source, inputs, expected } = check<
    {
      K_m_s: number
      Sy: number
      L_m: number
      h_at_divide_t0_m: number
      x_m: number[]
      t_s: number[]
    },
    { alpha: number; head: Record<string, number[]>; outflow_coefficient: number }
  >('PT-15')

  /** Boussinesq's profile: the share F of the highest head at the share u of the length (Polubarinova-Kochina 1962). */
  function profile(u: number): number {
    const lengthOf = (share: number) => {
      const steps = 400
      const end = 1 - Math.sqrt(1 - share)
      let sum = 0
      for (let k = 0; k < steps; k++) {
        const v = ((k + 0.5) * end) / steps
        const f = 1 - (1 - v) ** 2
        sum += ((6 * f * (1 - v)) / Math.sqrt(1 - f ** 3)) * (end / steps)
      }
      return sum
    }
    const whole = lengthOf(1)
    let [low, high] = [0, 1]
    for (let k = 0; k < 40; k++) {
      const middle = (low + high) / 2
      if (lengthOf(middle) / whole < u) low = middle
      else high = middle
    }
    return (low + high) / 2
  }

  it(`${title}, in a vertical section: heads within 0.3 % of the first height, outflow within 3 % (${source})`, () => {
    const { K_m_s: k, Sy, L_m: length, h_at_divide_t0_m: height } = inputs
    const [columns, rows] = [40, 18]
    const levels = Array.from({ length: columns }, (_, i) => height * profile((i + 0.5) / columns))
    const times = inputs.t_s
    const lastStep = 7200
    const solution = solveModel({
      format: 'lavant-model',
      version: 1,
      units: { length: 'm', time: 's' },
      kind: 'section',
      flow: 'free surface',
      extent: { x: [0, length], y: [0, 1.125 * height] },
      grid: { columns, rows },
      time: {
        kind: 'transient',
        initialHead: Array.from({ length: rows }, () => levels).flat(),
        stages: times.flatMap((time, index) => [
          {
            duration: time - (times[index - 1] ?? 0) - lastStep,
            firstStep: index === 0 ? 3600 : 43200,
            growth: 1.3,
            largestStep: index === 0 ? 86400 : 432000,
          },
          { duration: lastStep, firstStep: lastStep },
        ]),
      },
      materials: [{ name: 'Sand', kx: k, ky: k, specificYield: Sy }],
      ground: [{ material: 'Sand' }],
      boundaries: [{ name: 'Drain', kind: 'seepage face', line: upright(0, 0, 1.125 * height) }],
      points: inputs.x_m.map((x) => ({ name: `${x}`, x, y: 0.05 })),
    })
    const { result } = solution
    expect(result.converged).toBe(true)
    times.forEach((time, index) => {
      const at = 2 * index + 1
      const slower = 1 + (expected.alpha * k * height * (time - lastStep / 2)) / (Sy * length ** 2)
      const outflow = (expected.outflow_coefficient * k * height ** 2) / length / slower ** 2
      expect(relative(result.balance.outflow[at] as number, outflow)).toBeLessThan(0.03)
      expect(Math.abs(result.balance.errorPercent[at] as number)).toBeLessThan(1e-4)
      const heads = withKey(expected.head, time)
      inputs.x_m.forEach((x, place) => {
        expect(Math.abs(head(solution, `${x}`, at) - (heads[place] as number))).toBeLessThan(0.003 * height)
      })
    })
  })
})
