import { describe, expect, it } from 'vitest'
import type { Position, Stage } from '~/solver/model'
import type { Solution } from '~/solver/solve'
import {
  abstraction,
  aroundACell,
  bothWays,
  check,
  circle,
  extentOf,
  fixed,
  growing,
  intoModel,
  type Rest,
  relative,
  sheet,
  sideLine,
  solved,
  stagesTo,
} from './plan'

const eightADoubling = 2 ** (1 / 8)

/**
 * A quarter of endless ground round a well, which stands in its corner and gives a quarter of its rate: cells of
 * `cell` metres near it, growing out to `reach`.
 */
function lonelyWell(
  ground: { T_m2_s: number; S: number },
  cell: number,
  reach: number,
  rate: number | number[],
  stages: Stage[],
  points: Position[],
): Rest {
  const edges = growing(cell, 14, 1.11, reach)
  return {
    ...sheet(ground.T_m2_s, ground.S),
    extent: extentOf(edges, edges),
    grid: { xEdges: edges, yEdges: edges },
    time: { kind: 'transient', initialHead: 0, stages },
    wells: [abstraction(0, 0, typeof rate === 'number' ? rate / 4 : rate.map((one) => one / 4))],
    points: points.map(([x, y], index) => ({ name: String(index), x, y })),
  }
}

function drawdowns(solution: Solution, at: number): number[] {
  return solution.result.points.map(({ head: levels }) => -(levels[at] as number))
}

describe('PT-02', () => {
  const { title, source, inputs, expected } = check<
    {
      Q_m3_s: number
      T_m2_s: number
      S: number
      points_xy_from_well_m: Position[]
      times_s: number[]
    },
    { drawdown_at_times: Record<string, number[]> }
  >('PT-02')

  it(`${title}: on the suggested grid within 1 % after a day (${source})`, () => {
    // Its cells of 30 m around the well; further out, where nothing is asked for, they grow.
    const edges = aroundACell(30, 20, 1.15, 3000)
    const solution = solved({
      ...lonelyWell(
        inputs,
        30,
        3000,
        inputs.Q_m3_s,
        stagesTo(inputs.times_s, 7.5, eightADoubling),
        inputs.points_xy_from_well_m,
      ),
      extent: extentOf(edges, edges),
      grid: { xEdges: edges, yEdges: edges },
      wells: [abstraction(0, 0, inputs.Q_m3_s)],
    })
    const last = inputs.times_s.length - 1
    const exact = expected.drawdown_at_times[`${inputs.times_s[last]}.0`] as number[]
    drawdowns(solution, last).forEach((drawdown, index) => {
      // The first point stands in the next cell.
      expect(relative(drawdown, exact[index] as number)).toBeLessThan(index === 0 ? 0.015 : 0.01)
    })
  })

  it(`${title}: with cells of 5 m near the well within 1 % or a millimetre at all times`, () => {
    const stages = stagesTo(inputs.times_s, 7.5, eightADoubling)
    const solution = solved(lonelyWell(inputs, 5, 6000, inputs.Q_m3_s, stages, inputs.points_xy_from_well_m))
    inputs.times_s.forEach((time, at) => {
      const exact = expected.drawdown_at_times[`${time}.0`] as number[]
      drawdowns(solution, at).forEach((drawdown, index) => {
        const error = Math.abs(drawdown - (exact[index] as number))
        expect(error).toBeLessThan(0.01 * (exact[index] as number) + 6e-4)
      })
    })
  })
})

describe('PT-03', () => {
  const { title, source, inputs, expected } = check<
    { Q_m3_s: number; T_m2_s: number; S: number; r_m: number; t_s: number[] },
    { theis_drawdown: number[]; slope_per_log10_cycle_m: number; fit_last4: { T: number; S: number } }
  >('PT-03')

  it(`${title} (${source})`, () => {
    const stages = stagesTo(inputs.t_s, 5, eightADoubling)
    const points: Position[] = [[inputs.r_m, 0]]
    const solution = solved(lonelyWell(inputs, 5, 8000, inputs.Q_m3_s, stages, points))
    const drawdown = inputs.t_s.map((_, at) => drawdowns(solution, at)[0] as number)
    drawdown.forEach((value, at) => {
      expect(relative(value, expected.theis_drawdown[at] as number)).toBeLessThan(0.005)
    })
    // A straight line through the last four against the logarithm of time.
    const late = drawdown.slice(-4)
    const logs = inputs.t_s.slice(-4).map((time) => Math.log10(time))
    const meanLog = logs.reduce((sum, value) => sum + value, 0) / 4
    const meanDrawdown = late.reduce((sum, value) => sum + value, 0) / 4
    const above = logs.reduce(
      (sum, value, k) => sum + (value - meanLog) * ((late[k] as number) - meanDrawdown),
      0,
    )
    const slope = above / logs.reduce((sum, value) => sum + (value - meanLog) ** 2, 0)
    const t = (Math.LN10 * inputs.Q_m3_s) / (4 * Math.PI * slope)
    const zero = 10 ** (meanLog - meanDrawdown / slope)
    const storage = (4 * Math.exp(-0.5772156649) * t * zero) / inputs.r_m ** 2
    expect(relative(t, expected.fit_last4.T)).toBeLessThan(0.0015)
    expect(relative(storage, expected.fit_last4.S)).toBeLessThan(0.015)
    expect(relative(slope, expected.slope_per_log10_cycle_m)).toBeLessThan(0.006)
  })
})

describe('PT-04', () => {
  const { title, source, inputs, expected } = check<
    {
      Q_m3_s: number
      T_m2_s: number
      S: number
      r_m: number
      pumping_time_s: number
      time_since_stop_s: number[]
    },
    { residual_drawdown: number[] }
  >('PT-04')

  it(`${title} (${source})`, () => {
    const stop = inputs.pumping_time_s
    const times = [stop, ...inputs.time_since_stop_s.map((time) => stop + time)]
    const rates = times.map((_, stage) => (stage === 0 ? inputs.Q_m3_s : 0))
    const stages = stagesTo(times, 5, eightADoubling, [stop])
    const solution = solved(lonelyWell(inputs, 4, 6000, rates, stages, [[inputs.r_m, 0]]))
    expected.residual_drawdown.forEach((exact, index) => {
      expect(relative(drawdowns(solution, index + 1)[0] as number, exact)).toBeLessThan(0.005)
    })
  })
})

describe('PT-05', () => {
  const { title, source, inputs, expected } = check<{ pairs_u_rB: [number, number][] }, { W: number[] }>(
    'PT-05',
  )

  it(`${title}: the model's drawdown as far from a well in leaky ground (${source})`, () => {
    // B = 1000 m; r = (r/B) B and t = r² S / 4 T u.
    const [t, S, rate, B] = [0.001, 1e-4, 0.01, 1000]
    const cases = inputs.pairs_u_rB.map(([u, rB], index) => ({
      r: rB * B,
      time: ((rB * B) ** 2 * S) / (4 * t * u),
      w: expected.W[index] as number,
    }))
    const times = [...new Set(cases.map(({ time }) => Number(time.toPrecision(12))))].sort((a, b) => a - b)
    const solution = solved({
      ...lonelyWell(
        { T_m2_s: t, S },
        1.5,
        9 * B,
        rate,
        stagesTo(times, 5, 2 ** (1 / 5)),
        cases.map(({ r }): Position => [r, 0]),
      ),
      leakage: [{ name: 'Aquitard', head: 0, leakance: t / B ** 2 }],
    })
    cases.forEach(({ time, w }, index) => {
      const at = times.indexOf(Number(time.toPrecision(12)))
      const computed = ((drawdowns(solution, at)[index] as number) * 4 * Math.PI * t) / rate
      expect(relative(computed, w)).toBeLessThan(0.015)
    })
  })
})

describe('PT-07', () => {
  const { title, source, inputs, expected } = check<
    { t_over_F: number[] },
    { q_over_Q: number[]; v_over_Qt: number[] }
  >('PT-07')

  it(`${title} (${source})`, () => {
    const [a, t, S, rate] = [100, 0.001, 0.1, 0.01]
    const factor = (a * a * S) / t
    const times = inputs.t_over_F.map((ratio) => ratio * factor)
    // Half of the site: the well stands on its southern edge and gives half its rate.
    const xEdges = growing(a / 10, 30, 1.15, 300 * a)
    const yEdges = growing(a / 10, 20, 1.15, 300 * a)
    const extent = extentOf(xEdges, yEdges)
    const solution = solved({
      ...sheet(t, S),
      extent,
      grid: { xEdges, yEdges },
      time: {
        kind: 'transient',
        initialHead: 0,
        report: 'steps',
        stages: stagesTo(times, 0.002 * factor, 2 ** (1 / 6)),
      },
      wells: [abstraction(a, 0, rate / 2)],
      boundaries: [fixed('River', sideLine('west', extent), 0)],
    })
    const volume = (index: number) => (expected.v_over_Qt[index] as number) * (times[index] as number)
    const { volumes } = solution.result.balance
    let depleted = 0
    inputs.t_over_F.forEach((ratio, index) => {
      depleted += 2 * (volumes?.inflow[index] as number)
      const time = times[index] as number
      // 1 % of Q is asked for.
      expect(Math.abs(depleted / (rate * time) - volume(index) / time)).toBeLessThan(0.002)
      // The flow reported is the mean over the last step, so it is that of the step's middle.
      const at = solution.result.times.findIndex((end) => relative(end, time) < 1e-9)
      const middle = ((solution.result.times[at - 1] as number) + time) / 2
      const exact = complementaryError(1 / (2 * Math.sqrt(middle / factor)))
      expect(Math.abs((2 * intoModel(solution, 'River', at)) / rate - exact)).toBeLessThan(0.002)
      expect(
        Math.abs(complementaryError(1 / (2 * Math.sqrt(ratio))) - (expected.q_over_Q[index] as number)),
      ).toBeLessThan(1e-6)
    })
  })
})

/** erfc(x), x >= 0: Abramowitz & Stegun (1964) 7.1.26's error would show; so the series, or the continued fraction. */
function complementaryError(x: number): number {
  if (x < 2.5) {
    let term = x
    let sum = x
    for (let n = 1; n < 60; n++) {
      term *= (-x * x) / n
      sum += term / (2 * n + 1)
    }
    return 1 - (2 / Math.sqrt(Math.PI)) * sum
  }
  let fraction = 0
  for (let k = 60; k > 0; k--) fraction = k / 2 / (x + fraction)
  return Math.exp(-x * x) / Math.sqrt(Math.PI) / (x + fraction)
}

describe('PT-12', () => {
  const { title, source, inputs, expected } = check<
    { Q_m3_s: number; T_m2_s: number; S: number; distance_m: number; points_xy_m: Position[]; t_s: number[] },
    { drawdown: Record<string, number[]>; depletion_fraction: Record<string, number> }
  >('PT-12')

  it(`${title} (${source})`, () => {
    // The river along x = 0; the well on a corner of four cells.
    const xEdges = growing(10, 20, 1.2, 6000)
    const yEdges = bothWays(growing(10, 12, 1.2, 6000))
    const extent = extentOf(xEdges, yEdges)
    const solution = solved({
      ...sheet(inputs.T_m2_s, inputs.S),
      extent,
      grid: { xEdges, yEdges },
      time: {
        kind: 'transient',
        initialHead: 0,
        stages: stagesTo(inputs.t_s, 300, eightADoubling),
      },
      wells: [abstraction(inputs.distance_m, 0, inputs.Q_m3_s, 0.2)],
      boundaries: [fixed('River', sideLine('west', extent), 0)],
      points: inputs.points_xy_m.map(([x, y], index) => ({ name: String(index), x, y })),
    })
    inputs.t_s.forEach((time, at) => {
      const exact = expected.drawdown[`${time}.0`] as number[]
      const values = drawdowns(solution, at)
      for (const index of [1, 2]) {
        expect(relative(values[index] as number, exact[index] as number)).toBeLessThan(0.01)
      }
      const face = -(solution.result.wells[0]?.wellHead[at] as number)
      expect(relative(face, exact[0] as number)).toBeLessThan(0.005)
      // The mean over the last step, which is a twelfth of the time, lags behind its end.
      const depletion = intoModel(solution, 'River', at) / inputs.Q_m3_s
      expect(Math.abs(depletion - (expected.depletion_fraction[`${time}.0`] as number))).toBeLessThan(0.02)
    })
  })
})

describe('PT-13', () => {
  const { title, source, inputs, expected } = check<
    {
      T_m2_s: number
      S: number
      schedule: { start_s: number; Q_m3_s: number }[]
      points_xy_from_well_m: Position[]
      t_s: number[]
    },
    { drawdown: Record<string, number[]> }
  >('PT-13')

  it(`${title} (${source})`, () => {
    const change = inputs.schedule[1]?.start_s as number
    const times = [...inputs.t_s, change].sort((a, b) => a - b)
    const rates = times.map((end) => inputs.schedule[end <= change ? 0 : 1]?.Q_m3_s as number)
    const stages = stagesTo(times, 30, eightADoubling, [change])
    const solution = solved(lonelyWell(inputs, 10, 9000, rates, stages, inputs.points_xy_from_well_m))
    for (const time of inputs.t_s) {
      const values = drawdowns(solution, times.indexOf(time))
      values.forEach((value, index) => {
        const exact = (expected.drawdown[`${time}.0`] as number[])[index] as number
        expect(Math.abs(value - exact)).toBeLessThan(0.005 * exact)
      })
    }
  })
})

describe('PT-16', () => {
  const { title, source, inputs, expected } = check<{ alpha: number[] }, { G: number[] }>('PT-16')

  it(`${title}: a circle of small cells, its level let down at once (${source})`, () => {
    // A quarter of the site round a well of radius 1, twenty cells to the radius.
    const [t, S, drawdown] = [0.001, 0.001, 2]
    const edges = growing(1 / 20, 24, 1.15, 400)
    const extent = extentOf(edges, edges)
    const [, reach] = extent.x
    const round = circle(1, 1440).filter(([x, y]) => x > 0 && y > 0)
    const screen: Position[] = [[1, 0], ...round, [0, 1]]
    const times = inputs.alpha.map((alpha) => (alpha * S) / t)
    const solution = solved({
      ...sheet(t, S),
      ground: [
        {
          material: 'Ground',
          polygon: [[1, 0], [reach, 0], [reach, reach], [0, reach], ...screen.slice(1).reverse()],
          base: -1001,
          top: -1000,
        },
      ],
      extent,
      grid: { xEdges: edges, yEdges: edges },
      time: {
        kind: 'transient',
        initialHead: 0,
        report: 'steps',
        stages: stagesTo(times, 4e-3, 2 ** (1 / 6)),
      },
      boundaries: [fixed('Screen', screen, -drawdown)],
    })
    // Jacob & Lohman's function falls smoothly: between alphas it is read off logarithmically by its table's values.
    const flow = (at: number) => (-4 * intoModel(solution, 'Screen', at)) / (2 * Math.PI * t * drawdown)
    inputs.alpha.forEach((alpha, index) => {
      const at = solution.result.times.findIndex((end) => relative(end, (alpha * S) / t) < 1e-9)
      // Means over the last step and the next one, taken back to the time between them.
      const before = solution.result.times[at - 1] as number
      const end = solution.result.times[at] as number
      const after = solution.result.times[at + 1] ?? end
      const here =
        after > end
          ? flow(at) + ((flow(at + 1) - flow(at)) * (end - before)) / (after - before)
          : flow(at) +
            ((flow(at) - flow(at - 1)) * (end - before)) / (end - (solution.result.times[at - 2] as number))
      expect(relative(here, expected.G[index] as number)).toBeLessThan(0.01)
    })
  })
})
