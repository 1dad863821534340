import { describe, expect, it } from 'vitest'
import { balancerOf } from '~/solver/balancer'
import { discretise } from '~/solver/discretise'
import { track, type Velocities, velocitiesOf } from '~/solver/flow-lines'
import type { Boundary, Model, Position, Well } from '~/solver/model'
import { isInside } from '~/solver/polygon'
import { solveModel } from '~/solver/solve'
import published from './published.json'

function check<Inputs, Expected>(
  id: string,
): { title: string; source: string; inputs: Inputs; expected: Expected } {
  const found = published.find((entry) => entry.id === id)
  if (!found) throw new Error(`no published check ${id}`)
  return found as unknown as { title: string; source: string; inputs: Inputs; expected: Expected }
}

const cell = 10

/** A rectangle cut out of endless ground: heads of the formula along all its sides, one a cell. */
function cutOut(
  extent: { x: [number, number]; y: [number, number] },
  transmissivity: number,
  headAt: (x: number, y: number) => number,
  rest: Partial<Model>,
): Model {
  const [x0, x1] = extent.x
  const [y0, y1] = extent.y
  const corners: Position[] = [
    [x0, y0],
    [x1, y0],
    [x1, y1],
    [x0, y1],
  ]
  const boundaries = ['South', 'East', 'North', 'West'].map((name, k): Boundary => {
    const a = corners[k] as Position
    const b = corners[(k + 1) % 4] as Position
    const pieces = Math.round(Math.hypot(b[0] - a[0], b[1] - a[1]) / cell)
    const line = Array.from(
      { length: pieces + 1 },
      (_, i): Position => [a[0] + ((b[0] - a[0]) * i) / pieces, a[1] + ((b[1] - a[1]) * i) / pieces],
    )
    return { name, kind: 'fixed head', line, head: line.map(([x, y]) => headAt(x, y)) }
  })
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 's' },
    kind: 'plan',
    flow: 'confined',
    extent,
    grid: { columns: (x1 - x0) / cell, rows: (y1 - y0) / cell },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: transmissivity / 20, ky: transmissivity / 20, porosity: 0.25 }],
    ground: [{ material: 'Sand', base: -1020, top: -1000 }],
    boundaries,
    ...rest,
  }
}

function fieldOf(model: Model): Velocities {
  const balancer = balancerOf(discretise(model), 'multigrid', 1e-10, {})
  const outcome = balancer.solve(null, null)
  expect(outcome.converged).toBe(true)
  return velocitiesOf(balancer.field(outcome, null), outcome)
}

function endsAtWell(field: Velocities, x: number, y: number): boolean {
  return track(field, x, y, 'forward').end === 'well'
}

/** Halves the interval until it is known to a millimetre where `holds` changes. */
function turn(low: number, high: number, holds: (value: number) => boolean): number {
  const atLow = holds(low)
  expect(holds(high)).toBe(!atLow)
  while (high - low > 1e-3) {
    const middle = (low + high) / 2
    if (holds(middle) === atLow) low = middle
    else high = middle
  }
  return (low + high) / 2
}

describe('PS-16', () => {
  const { title, source, inputs, expected } = check<
    { Q_m3_s: number; T_m2_s: number; regional_gradient: number; thickness_m: number; porosity: number },
    {
      stagnation_distance_m: number
      half_width_at_well_m: number
      half_width_far_upstream_m: number
      travel_time_s_from_upgradient_x: Record<string, number>
    }
  >('PS-16')
  const { Q_m3_s: rate, T_m2_s: transmissivity, regional_gradient: gradient } = inputs
  // The water comes from high x; the well stands at (0, 0), in the middle of a cell.
  const model = cutOut(
    { x: [-405, 1605], y: [-705, 705] },
    transmissivity,
    (x, y) => gradient * x + (rate / (2 * Math.PI * transmissivity)) * Math.log(Math.hypot(x, y)),
    {
      wells: [{ name: 'W1', x: 0, y: 0, kind: 'abstraction', rate }],
      want: {
        flowLines: [
          { from: [500, 1], direction: 'forward' },
          { well: 'W1', direction: 'back', lines: 8 },
        ],
        captureZones: { times: [35233831] },
      },
    },
  )
  const field = fieldOf(model)
  /** Half the width of the zone at x, from its boundary x = -y / tan(2 pi T i y / Q). */
  const halfWidthAt = (x: number) => {
    const c = (2 * Math.PI * transmissivity * gradient) / rate
    return turn(1, expected.half_width_far_upstream_m - 1, (y) => -y / Math.tan(c * y) < x)
  }

  it(`${title}: the stagnation point lies within a cell (${source})`, () => {
    const distance = -turn(-400, -20, (x) => endsAtWell(field, x, 0.01))
    expect(Math.abs(distance - expected.stagnation_distance_m)).toBeLessThan(cell)
  })

  it('widths of the zone, at the well and upstream, within 2 %', () => {
    const beside = turn(20, 600, (y) => endsAtWell(field, 0, y))
    expect(Math.abs(beside / expected.half_width_at_well_m - 1)).toBeLessThan(0.02)
    for (const x of [200, 500, 1500]) {
      const half = turn(20, 600, (y) => endsAtWell(field, x, y))
      expect(Math.abs(half / halfWidthAt(x) - 1)).toBeLessThan(0.02)
    }
  })

  it.each(Object.entries(expected.travel_time_s_from_upgradient_x))(
    'travel time to the well from %s m upstream within 2 %%',
    (x, time) => {
      const found = track(field, Number(x), 1e-6, 'forward')
      expect(found.end).toBe('well')
      expect(Math.abs(found.time / time - 1)).toBeLessThan(0.02)
    },
  )

  it('lines asked for by the model say where they ended and when', () => {
    const [forward, ...back] = solveModel(model).result.flowLines ?? []
    expect(forward?.ended).toEqual({ at: 'well', name: 'W1' })
    expect(forward?.times.length).toBe(forward?.line.length)
    expect(forward?.times[0]).toBe(0)
    expect(forward?.line[0]).toEqual([500, 1])
    expect(forward?.line.at(-1)).toEqual([0, 0])
    expect(back.map(({ well }) => well)).toEqual(Array(8).fill('W1'))
    for (const line of back) {
      expect(line.ended.at).toBe('boundary')
      expect(line.line[0]).toEqual([0, 0])
      expect(line.times.every((time, k) => k === 0 || time > (line.times[k - 1] as number))).toBe(true)
    }
  })

  it('the outline of the zone agrees with where lines forward end, and its area within a time with the volume pumped', () => {
    const capture = solveModel(model).result.captureZones
    const zones = capture?.wells[0]?.zones
    const ever = zones?.[1]
    expect(ever?.time).toBeNull()
    const drained = capture?.drains.find((entry) => entry.at === 'well')
    expect(Math.abs((ever?.area as number) / (drained?.area as number) - 1)).toBeLessThan(0.02)
    for (const [x, y] of [
      [300, 100],
      [1000, 400],
      [-100, 5],
      [1400, 460],
    ] as Position[]) {
      expect(isInside(ever?.outline as Position[], x, y)).toBe(endsAtWell(field, x, y))
    }
    expect(isInside(ever?.outline as Position[], -250, 0)).toBe(false)
    // Within a time a well draws the pore water that it pumps in it.
    const volume = (zones?.[0]?.area as number) * inputs.thickness_m * inputs.porosity
    expect(Math.abs(volume / (rate * 35233831) - 1)).toBeLessThan(0.02)
  })
})

describe('PS-16b', () => {
  const { title, source, inputs, expected } = check<
    { Q_each_m3_s: number; regional_T_times_i_m2_s: number },
    {
      optimum_spacing_m: number
      width_far_upstream_m: number
      width_at_line_of_wells_m: number
      stagnation_distance_m: number
    }
  >('PS-16b')
  const { Q_each_m3_s: rate, regional_T_times_i_m2_s: flux } = inputs
  const transmissivity = 0.004
  function at(spacing: number): Velocities {
    const wells = [-1, 1].map(
      (side, k): Well => ({ name: `W${k + 1}`, x: 0, y: (side * spacing) / 2, kind: 'abstraction', rate }),
    )
    const model = cutOut(
      { x: [-405, 1605], y: [-905, 905] },
      transmissivity,
      (x, y) =>
        (flux / transmissivity) * x +
        wells.reduce(
          (sum, well) =>
            sum + (rate / (2 * Math.PI * transmissivity)) * Math.log(Math.hypot(x - well.x, y - well.y)),
          0,
        ),
      { wells },
    )
    return fieldOf(model)
  }
  const passes = (spacing: number) => !endsAtWell(at(spacing), 300, 0.01)

  it(`${title}: no water passes at 98 % of that spacing, some does at 102 % (${source})`, () => {
    expect(passes(0.98 * expected.optimum_spacing_m)).toBe(false)
    expect(passes(1.02 * expected.optimum_spacing_m)).toBe(true)
  })

  it('width at the line of the wells, and upstream from the discharge between the zone and the axis, within 2 %', () => {
    const field = at(expected.optimum_spacing_m)
    const half = turn(200, 880, (y) => endsAtWell(field, 0, y))
    expect(Math.abs((2 * half) / expected.width_at_line_of_wells_m - 1)).toBeLessThan(0.02)
    const up = turn(200, 900, (y) => endsAtWell(field, 1500, y))
    // The edge of the zone is where psi = U y + Q / (2 pi) (sum of the angles at the wells) equals its value far upstream.
    const psi = (x: number, y: number) =>
      flux * y +
      (rate / (2 * Math.PI)) *
        [-1, 1].reduce((sum, side) => sum + Math.atan2(y - (side * expected.optimum_spacing_m) / 2, x), 0)
    const edge = turn(200, 900, (y) => psi(1500, y) < (flux * expected.width_far_upstream_m) / 2)
    expect(Math.abs(up / edge - 1)).toBeLessThan(0.02)
  })
})

describe('a well in ground that conducts better one way (the transform of PS-14)', () => {
  const [rate, tx, ty] = [0.01, 0.004, 0.001]
  const stretched = (x: number, y: number) => x * x * Math.sqrt(ty / tx) + y * y * Math.sqrt(tx / ty)
  const model = cutOut(
    { x: [-405, 405], y: [-405, 405] },
    1,
    (x, y) => (rate / (4 * Math.PI * Math.sqrt(tx * ty))) * Math.log(stretched(x, y)),
    {
      materials: [{ name: 'Sand', kx: tx / 20, ky: ty / 20, porosity: 0.25 }],
      wells: [{ name: 'W1', x: 0, y: 0, kind: 'abstraction', rate }],
    },
  )
  const field = fieldOf(model)

  it.each([
    [200, 0],
    [0, 100],
    [150, 80],
    [-60, 90],
  ])('water from (%d, %d) moves straight to it, in the time of its ellipse', (x, y) => {
    const found = track(field, x, y, 'forward', { record: true })
    expect(found.end).toBe('well')
    const time = (Math.PI * 0.25 * 20 * stretched(x, y)) / rate
    expect(Math.abs(found.time / time - 1)).toBeLessThan(0.02)
  })
})
