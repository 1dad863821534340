import { describe, expect, it } from 'vitest'
import type { Boundary, Model, Position, Stage } from '~/solver/model'
import {
  check,
  extentOf,
  fixed,
  growing,
  head,
  intoModel,
  type Rest,
  rectangle,
  relative,
  sheet,
  sideLine,
  solved,
  solvedByBoth,
  stagesTo,
} from './plan'

/** A strip of one row, one metre wide, its western end (and eastern, with `ends` 2) held at `level`. */
function bank(
  edges: number[],
  ground: { T: number; S: number },
  level: Extract<Boundary, { kind: 'fixed head' }>['head'],
  time: Omit<Extract<Model['time'], { kind: 'transient' }>, 'kind'>,
  places: number[],
  ends: 1 | 2 = 1,
): Rest {
  const extent = extentOf(edges, [0, 1])
  const sides = (['west', 'east'] as const).slice(0, ends)
  return {
    ...sheet(ground.T, ground.S),
    extent,
    grid: { xEdges: edges, yEdges: [0, 1] },
    time: { kind: 'transient', ...time },
    boundaries: sides.map(
      (side): Boundary => ({
        name: side,
        kind: 'fixed head',
        line: sideLine(side, extent),
        head: level,
      }),
    ),
    points: places.map((x) => ({ name: String(x), x, y: 0.5 })),
  }
}

function evenEdges(length: number, cells: number): number[] {
  return Array.from({ length: cells + 1 }, (_, k) => (k * length) / cells)
}

describe('PT-08', () => {
  const { title, source, inputs, expected } = check<
    { T_m2_s: number; S: number; rise_m: number; x_m: number[]; t_s: number[] },
    {
      head_rise: Record<string, number[]>
      volume_per_m: Record<string, number>
      flux_into_bank_per_m: Record<string, number>
    }
  >('PT-08')

  it(`${title} (${source})`, () => {
    const edges = growing(2, 60, 1.05, 4000)
    const stages = stagesTo(inputs.t_s, 500, 1.05)
    const ground = { T: inputs.T_m2_s, S: inputs.S }
    const solution = solvedByBoth(bank(edges, ground, inputs.rise_m, { initialHead: 0, stages }, inputs.x_m))
    let volume = 0
    inputs.t_s.forEach((time, at) => {
      const exact = expected.head_rise[`${time}.0`] as number[]
      inputs.x_m.forEach((x, index) => {
        expect(Math.abs(head(solution, String(x), at) - (exact[index] as number))).toBeLessThan(5e-4)
      })
      volume += solution.result.balance.volumes?.inflow[at] as number
      expect(relative(volume, expected.volume_per_m[`${time}.0`] as number)).toBeLessThan(0.001)
      // The mean over the last step, which is a twentieth of the time.
      expect(
        relative(intoModel(solution, 'west', at), expected.flux_into_bank_per_m[`${time}.0`] as number),
      ).toBeLessThan(0.02)
    })
  })
})

describe('PT-08b', () => {
  const { title, source, inputs, expected } = check<
    { T_m2_s: number; S: number; L_m: number; rise_m: number; x_m: number[]; t_s: number[] },
    { head_rise: Record<string, number[]> }
  >('PT-08b')

  it(`${title} (${source})`, () => {
    const stages = stagesTo(inputs.t_s, 1000, 2 ** (1 / 24))
    const ground = { T: inputs.T_m2_s, S: inputs.S }
    const edges = evenEdges(inputs.L_m, inputs.L_m / 2)
    const solution = solvedByBoth(bank(edges, ground, inputs.rise_m, { initialHead: 0, stages }, inputs.x_m))
    inputs.t_s.forEach((time, at) => {
      const exact = expected.head_rise[`${time}.0`] as number[]
      inputs.x_m.forEach((x, index) => {
        expect(Math.abs(head(solution, String(x), at) - (exact[index] as number))).toBeLessThan(5e-4)
      })
    })
  })
})

describe('PT-09', () => {
  const { title, source, inputs, expected } = check<{ pairs: [number, number][] }, { S_star: number[] }>(
    'PT-09',
  )

  it.each([1, 5, 2])(`${title}: mounds under basins %d times as long as wide (${source})`, (ratio) => {
    // With T and S constant the mound in the middle is (w t / S) S*(a / sqrt(4 T t / S), b / sqrt(4 T t / S)).
    const [a, t, S, rate] = [50, 0.001, 0.1, 1e-6]
    const b = ratio * a
    const cases = inputs.pairs
      .map(([alpha, beta], index) => ({ alpha, beta, value: expected.S_star[index] as number }))
      .filter(({ alpha, beta }) => Math.abs(beta / alpha - ratio) < 1e-9)
      .sort((one, other) => other.alpha - one.alpha)
    expect(cases.length).toBeGreaterThan(0)
    const times = cases.map(({ alpha }) => ((a / alpha) ** 2 * S) / (4 * t))
    const reach = Math.max(20 * a, 5 * Math.sqrt((4 * t * (times[times.length - 1] as number)) / S))
    const xEdges = growing(a / 10, 20, 1.12, reach)
    const yEdges = growing(a / 10, 10 * ratio + 10, 1.12, reach)
    const solution = solved({
      ...sheet(t, S),
      extent: extentOf(xEdges, yEdges),
      grid: { xEdges, yEdges },
      time: {
        kind: 'transient',
        initialHead: 0,
        stages: stagesTo(times, 0.02 * (times[0] as number), 2 ** (1 / 6)),
      },
      recharge: [{ name: 'Basin', polygon: rectangle(0, a, 0, b), rate }],
      points: [{ name: 'middle', x: 0, y: 0 }],
    })
    cases.forEach(({ value }, at) => {
      const computed = (head(solution, 'middle', at) * S) / (rate * (times[at] as number))
      expect(relative(computed, value)).toBeLessThan(0.002)
    })
  })
})

describe('PT-10', () => {
  const { title, source, inputs, expected } = check<
    {
      K_m_s: number
      Sy: number
      recharge_m_s: number
      initial_thickness_m: number
      half_width_x_m: number
      half_length_y_m: number
      points_xy_m: Position[]
      t_s: number
    },
    { head: number[]; mound_height: number[] }
  >('PT-10')

  it(`${title}: Dupuit's equation itself, within 0.5 % of the mound of the linear one (${source})`, () => {
    // A quarter of the site.
    const edges = growing(2.5, 50, 1.15, 1000)
    const start = inputs.initial_thickness_m
    const solution = solvedByBoth({
      flow: 'unconfined',
      materials: [{ name: 'Ground', kx: inputs.K_m_s, ky: inputs.K_m_s, specificYield: inputs.Sy }],
      ground: [{ material: 'Ground', base: 0 }],
      extent: extentOf(edges, edges),
      grid: { xEdges: edges, yEdges: edges },
      time: {
        kind: 'transient',
        initialHead: start,
        stages: [{ duration: inputs.t_s, firstStep: inputs.t_s / 200, growth: 1.15 }],
      },
      recharge: [
        {
          name: 'Basin',
          polygon: rectangle(0, inputs.half_width_x_m, 0, inputs.half_length_y_m),
          rate: inputs.recharge_m_s,
        },
      ],
      points: inputs.points_xy_m.map(([x, y], index) => ({ name: String(index), x, y })),
    })
    const highest = expected.mound_height[0] as number
    expected.head.forEach((level, index) => {
      expect(Math.abs(head(solution, String(index)) - level) / highest).toBeLessThan(0.005)
    })
    const brought = 4 * (solution.result.balance.volumes?.storage[0] as number)
    const area = 4 * inputs.half_width_x_m * inputs.half_length_y_m
    expect(relative(brought, inputs.recharge_m_s * area * inputs.t_s)).toBeLessThan(1e-8)
  })
})

describe('PT-11', () => {
  const { title, source, inputs, expected } = check<
    { T_m2_s: number; S: number; amplitude_m: number; period_s: number; x_m: number[] },
    { amplitude: number[]; lag_s: number[]; wavelength_m: number }
  >('PT-11')

  it(`${title}, its levels by stage: ten times better than steps of first order (${source})`, () => {
    const { amplitude_m: amplitude, period_s: period } = inputs
    const [periods, perPeriod] = [6, 100]
    // Each stage holds the stage's mean over its duration and takes two steps: its middle is what is looked at.
    const duration = period / perPeriod
    const angle = (2 * Math.PI) / perPeriod
    const levels = Array.from({ length: periods * perPeriod }, (_, k) => {
      return (amplitude * (Math.cos(k * angle) - Math.cos((k + 1) * angle))) / angle
    })
    const stages: Stage[] = levels.map(() => ({ duration, firstStep: duration / 2, growth: 1 }))
    const ground = { T: inputs.T_m2_s, S: inputs.S }
    const edges = growing(expected.wavelength_m / 100, 60, 1.1, 2 * expected.wavelength_m)
    const places = inputs.x_m.slice(1)
    const solution = solved(
      bank(edges, ground, { stages: levels }, { initialHead: 0, report: 'steps', stages }, places),
    )
    expect(solution.result.times).toHaveLength(2 * levels.length)
    places.forEach((x, index) => {
      // The first harmonic of the last period, from the middles of its stages.
      let [sine, cosine] = [0, 0]
      for (let k = (periods - 1) * perPeriod; k < periods * perPeriod; k++) {
        const phase = (k + 0.5) * angle
        sine += (2 / perPeriod) * Math.sin(phase) * head(solution, String(x), 2 * k)
        cosine += (2 / perPeriod) * Math.cos(phase) * head(solution, String(x), 2 * k)
      }
      const lag = (Math.atan2(-cosine, sine) / (2 * Math.PI)) * period
      expect(relative(Math.hypot(sine, cosine), expected.amplitude[index + 1] as number)).toBeLessThan(0.0015)
      expect(Math.abs(lag - (expected.lag_s[index + 1] as number)) / period).toBeLessThan(5e-4)
    })
  })
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
    { head: Record<string, number[]>; outflow_per_m: Record<string, number>; alpha: number }
  >('PT-15')

  /** F of Boussinesq's profile at x / L: x / L = I(F^3; 2/3, 1/2), by the integral of F / sqrt(1 - F^3). */
  function profile(share: number): number {
    const integral = (f: number) => {
      // With F = 1 - (1 - f) s² the singular end at F = 1 is smooth; Simpson's rule over s, from F to 1.
      const steps = 400
      let sum = 0
      for (let k = 0; k <= steps; k++) {
        const s = k / steps
        const here = 1 - (1 - f) * s * s
        const cube = 1 - here ** 3
        const value = s === 0 ? 2 * Math.sqrt((1 - f) / 3) : (2 * (1 - f) * s * here) / Math.sqrt(cube)
        sum += value * (k === 0 || k === steps ? 1 : k % 2 === 1 ? 4 : 2)
      }
      return sum / (3 * steps)
    }
    const whole = integral(0)
    let [low, high] = [0, 1]
    for (let step = 0; step < 50; step++) {
      const middle = (low + high) / 2
      if (1 - integral(middle) / whole < share) low = middle
      else high = middle
    }
    return (low + high) / 2
  }

  it(`${title} (${source})`, () => {
    const { L_m: length, h_at_divide_t0_m: highest } = inputs
    const cells = 100
    const edges = evenEdges(length, cells)
    const extent = extentOf(edges, [0, 1])
    const middles = Array.from({ length: cells }, (_, k) => highest * profile((k + 0.5) / cells))
    const times = inputs.t_s
    const solution = solvedByBoth({
      flow: 'unconfined',
      materials: [{ name: 'Ground', kx: inputs.K_m_s, ky: inputs.K_m_s, specificYield: inputs.Sy }],
      ground: [{ material: 'Ground', base: 0 }],
      extent,
      grid: { xEdges: edges, yEdges: [0, 1] },
      time: {
        kind: 'transient',
        initialHead: middles,
        report: 'steps',
        stages: stagesTo(times, 2000, 1.05),
      },
      boundaries: [fixed('Drain', sideLine('west', extent), 0)],
      points: inputs.x_m.map((x) => ({ name: String(x), x, y: 0.5 })),
    })
    for (const time of times) {
      const at = solution.result.times.findIndex((end) => relative(end, time) < 1e-9)
      const exact = expected.head[`${time}.0`] as number[]
      inputs.x_m.forEach((x, index) => {
        expect(Math.abs(head(solution, String(x), at) - (exact[index] as number)) / highest).toBeLessThan(
          5e-4,
        )
      })
      // The outflow falls as 1 / (1 + rate t)²; its mean over the last step, exactly.
      const rate = (expected.alpha * inputs.K_m_s * highest) / (inputs.Sy * length ** 2)
      const before = solution.result.times[at - 1] as number
      const mean = (expected.outflow_per_m['0.0'] as number) / ((1 + rate * before) * (1 + rate * time))
      expect(relative(-intoModel(solution, 'Drain', at), mean)).toBeLessThan(0.002)
      expect(Math.min(...(solution.fields[at + 1]?.heads ?? []))).toBeGreaterThan(0)
    }
  })
})

describe('PT-17', () => {
  const { title, source, inputs, expected } = check<
    {
      K_m_s: number
      average_depth_m: number
      Sy: number
      spacing_m: number
      initial_height_m: number
      x_m: number[]
      t_s: number[]
    },
    { height: Record<string, number[]> }
  >('PT-17')

  it(`${title} (${source})`, () => {
    const ground = { T: inputs.K_m_s * inputs.average_depth_m, S: inputs.Sy }
    const edges = evenEdges(inputs.spacing_m, 80)
    const stages = stagesTo(inputs.t_s, 200, 1.03)
    const solution = solvedByBoth(
      bank(edges, ground, 0, { initialHead: inputs.initial_height_m, stages }, inputs.x_m, 2),
    )
    inputs.t_s.forEach((time, at) => {
      const exact = expected.height[`${time}.0`] as number[]
      inputs.x_m.forEach((x, index) => {
        expect(relative(head(solution, String(x), at), exact[index] as number)).toBeLessThan(0.001)
      })
    })
  })
})
