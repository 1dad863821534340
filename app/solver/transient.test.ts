import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import type { Boundary, Model, Position, Stage, TransientTime } from './model'
import { ModelError } from './model-error'
import { type Solution, solveModel } from './solve'

type Changes = Partial<Omit<Model, 'time'>> & { time?: Partial<TransientTime> }

const day: Stage = { name: 'Day', duration: 1, firstStep: 0.02, growth: 1.4 }

function side(name: 'West' | 'East', head: Extract<Boundary, { kind: 'fixed head' }>['head']): Boundary {
  const x = name === 'West' ? 0 : 100
  return {
    name,
    kind: 'fixed head',
    line: [
      [x, 0],
      [x, 100],
    ],
    head,
  }
}

/** 100 x 100 m of sand, 10 m thick, held at 12 m in the west and 11 m in the east, and all at 11.5 m at the start. */
function site({ time, ...changes }: Changes = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 100], y: [0, 100] },
    grid: { columns: 10, rows: 10 },
    materials: [{ name: 'Sand', kx: 5, ky: 5, specificStorage: 1e-4, specificYield: 0.2 }],
    ground: [{ material: 'Sand', base: 0, top: 10 }],
    boundaries: [side('West', 12), side('East', 11)],
    ...changes,
    time: { kind: 'transient', initialHead: 11.5, stages: [day], ...time },
  }
}

function solved(model: Model): Solution {
  const solution = solveModel(model)
  expect(solution.result.converged).toBe(true)
  return solution
}

function well(x: number, y: number, rate: number | number[], name = 'W') {
  return { name, x, y, kind: 'abstraction' as const, rate }
}

function largestDifference(one: ArrayLike<number>, other: ArrayLike<number>): number {
  let largest = 0
  for (let k = 0; k < one.length; k++) {
    largest = Math.max(largest, Math.abs((one[k] as number) - (other[k] as number)))
  }
  return largest
}

function refusal(model: Model): ModelError {
  try {
    solveModel(model)
  } catch (error) {
    if (error instanceof ModelError) return error
    throw error
  }
  throw new Error('the model was not refused')
}

const inside = fc.double({ min: 6, max: 94, noNaN: true })
const rate = fc.double({ min: 0.1, max: 40, noNaN: true })
const method = fc.constantFrom('sor' as const, 'multigrid' as const)
const runs = { numRuns: 10 }

const threeStages: Stage[] = [
  { duration: 0.5, firstStep: 0.05, growth: 1.3 },
  { duration: 2, firstStep: 0.2, growth: 1, largestStep: 0.4 },
  { duration: 1 },
]

/** Wells, a river that cuts off, a drain and recharge, all of them changing by stage. */
function busy(x: number, y: number, rates: number[], unconfined: boolean): Changes {
  return {
    ...(unconfined
      ? { flow: 'unconfined', ground: [{ material: 'Sand', base: 0, top: 11.6 }] }
      : { flow: 'confined' }),
    wells: [well(x, y, rates)],
    recharge: [{ name: 'Rain', rate: [0.001, 0, 0.004] }],
    boundaries: [
      side('West', { stages: [12, [12, 11], 11.2] }),
      {
        name: 'River',
        kind: 'head-dependent flux',
        line: [
          [80, 0],
          [90, 100],
        ],
        head: { stages: [11, 11.5, 10] },
        conductance: 0.2,
        disconnectsBelow: 9.8,
      },
      {
        name: 'Ditch',
        kind: 'drain',
        line: [
          [40, 20],
          [40, 80],
        ],
        level: { stages: [11.8, 11.3, 11.6] },
        conductance: 0.1,
      },
    ],
    rings: [
      {
        name: 'Ring',
        polygon: [
          [21, 12],
          [77, 18],
          [60, 88],
        ],
      },
    ],
  }
}

describe('flow through time', () => {
  it('closes its balance over every step, of the whole and of any ring, by both methods', () => {
    fc.assert(
      fc.property(
        inside,
        inside,
        fc.array(rate, { minLength: 3, maxLength: 3 }),
        fc.boolean(),
        method,
        (x, y, rates, unconfined, by) => {
          const { result } = solved(
            site({
              ...busy(x, y, rates, unconfined),
              solver: { method: by },
              time: { report: 'steps', stages: threeStages },
            }),
          )
          expect(result.times.length).toBe(result.steps)
          result.times.forEach((_, at) => {
            const [inflow, outflow, storage] = (['inflow', 'outflow', 'storage'] as const).map(
              (key) => result.balance[key][at] as number,
            ) as [number, number, number]
            expect(Math.abs(inflow - outflow - storage)).toBeLessThan(1e-6 * Math.max(inflow, outflow))
            expect(Math.abs(result.rings[0]?.error[at] as number)).toBeLessThan(
              1e-6 * Math.max(inflow, outflow),
            )
          })
        },
      ),
      runs,
    )
  })

  it('adds its volumes up by stage: the sum over the steps of what flows, and of what heads say is stored', () => {
    fc.assert(
      fc.property(inside, inside, fc.array(rate, { minLength: 3, maxLength: 3 }), (x, y, rates) => {
        const model = site({ ...busy(x, y, rates, false), time: { report: 'steps', stages: threeStages } })
        const { result, fields } = solved(model)
        const ends = [0.5, 2.5, 3.5]
        const { volumes } = result.balance
        ends.forEach((end, stage) => {
          const start = stage === 0 ? 0 : (ends[stage - 1] as number)
          const sums = { inflow: 0, outflow: 0, storage: 0 }
          result.times.forEach((time, at) => {
            if (time <= start + 1e-9 || time > end + 1e-9) return
            const dt = time - (at === 0 ? 0 : (result.times[at - 1] as number))
            for (const key of ['inflow', 'outflow', 'storage'] as const) {
              sums[key] += dt * (result.balance[key][at] as number)
            }
          })
          for (const key of ['inflow', 'outflow', 'storage'] as const) {
            expect(volumes?.[key][stage]).toBeCloseTo(sums[key], 7)
          }
          const heads = (time: number) =>
            fields.find((field) => Math.abs(field.time - time) < 1e-9)?.heads as Float64Array
          const before = heads(start)
          const gained = heads(end).reduce((sum, head, cell) => sum + head - (before[cell] as number), 0)
          // 100 m² a cell, 10 m of 1e-4.
          expect(volumes?.storage[stage]).toBeCloseTo(gained * 100 * 10 * 1e-4, 7)
        })
      }),
      runs,
    )
  })

  it('superposes in confined ground: two wells, each by its own schedule, draw down by the sum of both', () => {
    fc.assert(
      fc.property(inside, inside, inside, inside, rate, rate, (x1, y1, x2, y2, q1, q2) => {
        const stages = [day, day]
        const heads = (wells: ReturnType<typeof well>[]) => solved(site({ wells, time: { stages } })).heads
        const first = well(x1, y1, [q1, 0])
        const second = well(x2, y2, [q2 / 2, q2], 'V')
        const [none, one, other, both] = [[], [first], [second], [first, second]].map(heads) as [
          Float64Array,
          Float64Array,
          Float64Array,
          Float64Array,
        ]
        const sum = both.map((_, c) => (one[c] as number) + (other[c] as number) - (none[c] as number))
        expect(largestDifference(both, sum)).toBeLessThan(1e-7)
      }),
      runs,
    )
  })

  it('knows no datum: a thousand metres on every level move every head by a thousand and no flow', () => {
    fc.assert(
      fc.property(inside, inside, rate, fc.boolean(), (x, y, amount, unconfined) => {
        const at = (datum: number) =>
          solved(
            site({
              flow: unconfined ? 'unconfined' : 'confined',
              ground: [{ material: 'Sand', base: datum, top: datum + 11.5 }],
              boundaries: [side('West', { stages: [12 + datum, 10 + datum] })],
              wells: [{ ...well(x, y, amount), lowestLevel: 3 + datum }],
              time: { initialHead: 11.4 + datum, stages: [day, day] },
            }),
          )
        const low = at(0)
        const high = at(1000)
        expect(
          largestDifference(
            low.heads.map((head) => head + 1000),
            high.heads,
          ),
        ).toBeLessThan(1e-6)
        expect(high.result.balance.storage[1]).toBeCloseTo(low.result.balance.storage[1] as number, 4)
      }),
      runs,
    )
  })

  it('knows no unit: the same site in feet and seconds has the same heads at the same times', () => {
    fc.assert(
      fc.property(inside, inside, rate, fc.boolean(), (x, y, amount, unconfined) => {
        const inUnits = (length: number, time: number) =>
          solved({
            ...site({
              units: length === 1 ? { length: 'm', time: 'd' } : { length: 'ft', time: 's' },
              flow: unconfined ? 'unconfined' : 'confined',
              extent: { x: [0, 100 / length], y: [0, 100 / length] },
              materials: [
                {
                  name: 'Sand',
                  kx: (5 / length) * time,
                  ky: (5 / length) * time,
                  specificStorage: 1e-4 * length,
                  specificYield: 0.2,
                },
              ],
              ground: [{ material: 'Sand', base: 0, top: 12 / length }],
              boundaries: [
                {
                  name: 'West',
                  kind: 'fixed head',
                  line: [
                    [0, 0],
                    [0, 100 / length],
                  ],
                  head: 12 / length,
                },
              ],
              wells: [well(x / length, y / length, (amount / length ** 3) * time)],
            }),
            time: {
              kind: 'transient',
              initialHead: 11.5 / length,
              stages: [{ duration: 2 / time, firstStep: 0.02 / time, growth: 1.4 }],
            },
          })
        const metric = inUnits(1, 1)
        const imperial = inUnits(0.3048, 1 / 86400)
        expect(imperial.result.steps).toBe(metric.result.steps)
        expect(
          largestDifference(
            metric.heads,
            imperial.heads.map((head) => head * 0.3048),
          ),
        ).toBeLessThan(1e-7)
      }),
      runs,
    )
  })

  it('ends up steady: after long the heads are those of steady flow, in confined and unconfined ground', () => {
    for (const unconfined of [false, true]) {
      const changes: Changes = {
        flow: unconfined ? 'unconfined' : 'confined',
        ground: [{ material: 'Sand', base: 0, top: unconfined ? 11.4 : 10 }],
        wells: [well(42, 57, 25)],
      }
      const late = solved(
        site({ ...changes, time: { stages: [{ duration: 1e5, firstStep: 0.1, growth: 1.5 }] } }),
      )
      const steady = solved({ ...site(changes), time: { kind: 'steady' } })
      expect(largestDifference(late.heads, steady.heads)).toBeLessThan(1e-6)
    }
  })

  it('starts from steady heads, with the wells or without, and stays there while nothing changes', () => {
    const wells = [well(42, 57, 25)]
    const stages = [day, { duration: 100 }]
    const atRest = solved(site({ wells: [well(42, 57, [0, 0])], time: { initialHead: 'steady', stages } }))
    for (const { heads } of atRest.fields) {
      expect(largestDifference(heads, atRest.fields[0]?.heads ?? [])).toBeLessThan(1e-8)
    }
    const pumped = solved(site({ wells, time: { initialHead: 'steady with wells', stages } }))
    expect(largestDifference(pumped.heads, pumped.fields[0]?.heads ?? [])).toBeLessThan(1e-7)
    expect(pumped.result.balance.storage[1]).toBeCloseTo(0, 6)
    const off = solved(site({ wells, time: { initialHead: 'steady', stages } }))
    expect(largestDifference(off.fields[0]?.heads ?? [], atRest.heads)).toBeLessThan(1e-8)
    expect(largestDifference(off.heads, pumped.heads)).toBeLessThan(1e-4)
  })
})

describe('steps in time', () => {
  /** A closed strip of 16 cells whose heads are one wave; it decays by exp(-lambda t), lambda known exactly. */
  function wave(steps: number): number {
    const cells = 16
    const shape = Array.from({ length: cells }, (_, i) => Math.cos((Math.PI * (i + 0.5)) / cells))
    const dx = 10
    const [transmissivity, storage] = [50, 1e-3]
    const lambda = ((2 * transmissivity) / (storage * dx * dx)) * (1 - Math.cos(Math.PI / cells))
    const duration = 1 / lambda
    const { heads } = solved(
      site({
        extent: { x: [0, cells * dx], y: [0, 10] },
        grid: { columns: cells, rows: 1 },
        boundaries: [],
        time: {
          initialHead: shape,
          stages: [{ duration, firstStep: duration / steps, growth: 1 }],
        },
        solver: { tolerance: 1e-13 },
      }),
    )
    return largestDifference(
      heads,
      shape.map((head) => head * Math.exp(-1)),
    )
  }

  it('are of second order: half the step, a quarter of the error', () => {
    const errors = [4, 8, 16, 32].map(wave)
    for (let k = 1; k < errors.length; k++) {
      const order = Math.log2((errors[k - 1] as number) / (errors[k] as number))
      expect(order).toBeGreaterThan(1.85)
      expect(order).toBeLessThan(2.2)
    }
    expect(errors[3]).toBeLessThan(1e-4)
  })

  it('are of second order in unconfined ground too, where the thickness falls with the head', () => {
    // One cell between two faces held at b: Sy A dh/dt = -2 K (h² - b²) w / (2 l), so h = b coth(a b t + c).
    const [k, yieldShare, b, start, duration] = [5, 0.2, 4, 9, 4]
    const error = (steps: number) => {
      const { heads } = solved(
        site({
          flow: 'unconfined',
          extent: { x: [0, 20], y: [0, 10] },
          grid: { columns: 1, rows: 1 },
          ground: [{ material: 'Sand', base: 0 }],
          materials: [{ name: 'Sand', kx: k, ky: k, specificYield: yieldShare }],
          boundaries: [0, 20].map(
            (x): Boundary => ({
              name: `Face ${x}`,
              kind: 'fixed head',
              line: [
                [x, 0],
                [x, 10],
              ],
              head: b,
            }),
          ),
          time: { initialHead: start, stages: [{ duration, firstStep: duration / steps, growth: 1 }] },
          solver: { tolerance: 1e-13 },
        }),
      )
      const a = (2 * k * 10) / (2 * 10) / (yieldShare * 200)
      const c = Math.atanh(b / start)
      return Math.abs((heads[0] as number) - b / Math.tanh(a * b * duration + c))
    }
    const errors = [8, 16, 32, 64].map(error)
    for (let step = 1; step < errors.length; step++) {
      expect(Math.log2((errors[step - 1] as number) / (errors[step] as number))).toBeGreaterThan(1.8)
    }
    expect(errors[3]).toBeLessThan(1e-4)
  })

  it('end with every stage, grow as asked and never beyond the largest', () => {
    const { result } = solved(site({ time: { report: 'steps', stages: threeStages } }))
    const { times } = result
    const steps = times.map((time, at) => time - (at === 0 ? 0 : (times[at - 1] as number)))
    for (const end of [0.5, 2.5, 3.5]) expect(times.some((time) => time === end)).toBe(true)
    expect(steps[0]).toBeCloseTo(0.05, 12)
    expect(steps[1]).toBeCloseTo(0.065, 12)
    expect(Math.min(...steps)).toBeGreaterThan(0)
    const second = steps.filter((_, at) => (times[at] as number) > 0.5 + 1e-9 && (times[at] as number) <= 2.5)
    for (const step of second) expect(step).toBeLessThanOrEqual(0.4 + 1e-12)
  })

  it('that find themselves keep their error small, with far fewer of them than even ones would need', () => {
    const stage: Stage = { duration: 50, steps: 'automatic' }
    const changes: Changes = { wells: [well(45, 55, 30)] }
    const automatic = solved(site({ ...changes, time: { stages: [stage] } }))
    const fine = solved(
      site({ ...changes, time: { stages: [{ duration: 50, firstStep: 1e-4, growth: 1.02 }] } }),
    )
    const range = Math.max(...fine.heads) - Math.min(...fine.heads)
    expect(largestDifference(automatic.heads, fine.heads) / range).toBeLessThan(1e-3)
    expect(automatic.result.steps as number).toBeLessThan(0.4 * (fine.result.steps as number))
  })
})

describe('wells through time', () => {
  it('lower a closed site evenly by what they take', () => {
    const { heads, result } = solved(
      site({ boundaries: [], wells: [well(50, 50, 3)], time: { stages: [{ duration: 30 }] } }),
    )
    const mean = heads.reduce((sum, head) => sum + head, 0) / heads.length
    // 90 m³ out of 10,000 m² x 10 m x 1e-4.
    expect(mean).toBeCloseTo(11.5 - 90 / 10, 8)
    expect(result.balance.volumes?.outflow[0]).toBeCloseTo(90, 8)
    expect(result.balance.volumes?.storage[0]).toBeCloseTo(-90, 8)
  })

  it('that would dry their cell are reduced while they do, say so, and the ground fills again after them', () => {
    const { result, fields } = solved(
      site({
        flow: 'unconfined',
        ground: [{ material: 'Sand', base: 0 }],
        boundaries: [side('West', 3)],
        wells: [{ ...well(85, 50, [60, 0]), radius: 0.1 }],
        time: { initialHead: 3, report: 'stages', stages: [{ duration: 60 }, { duration: 2000 }] },
      }),
    )
    const [pumping, resting] = (result.wells[0]?.achieved ?? []) as [number, number]
    expect(pumping).toBeGreaterThan(1)
    expect(pumping).toBeLessThan(59)
    expect(resting).toBe(0)
    expect(result.warnings.map(({ code }) => code)).toContain('well-reduced')
    for (const { heads } of fields) expect(Math.min(...heads)).toBeGreaterThan(0)
    expect(Math.min(...(fields[2]?.heads ?? []))).toBeGreaterThan(2.9)
    for (const percent of result.balance.errorPercent) expect(Math.abs(percent)).toBeLessThan(1e-4)
  })

  it('stop at their lowest level when they reach it, not before', () => {
    const { result } = solved(
      site({
        boundaries: [side('West', 12)],
        wells: [{ ...well(75, 45, 120), radius: 0.1, lowestLevel: 9 }],
        time: { report: 'steps', stages: [{ duration: 5, firstStep: 1e-4, growth: 1.3 }] },
      }),
    )
    const { achieved, wellHead } = result.wells[0] as NonNullable<(typeof result.wells)[0]>
    expect(achieved[0]).toBeCloseTo(120, 6)
    expect(achieved[achieved.length - 1]).toBeLessThan(119)
    for (const level of wellHead) expect(level).toBeGreaterThan(9 - 1e-6)
  })
})

describe('hostile models through time', () => {
  const sand = { name: 'Sand', kx: 5, ky: 5 }

  it.each<[string, Changes, string, RegExp]>([
    ['no stage', { time: { stages: [] } }, 'time.stages', /no stage/],
    [
      'a stage without duration',
      { time: { stages: [day, { duration: 0 }] } },
      'time.stages[1].duration',
      /./,
    ],
    [
      'a stage that never ends',
      { time: { stages: [{ duration: Number.POSITIVE_INFINITY }] } },
      'time.stages[0].duration',
      /./,
    ],
    [
      'a duration that is no number',
      { time: { stages: [{ duration: Number.NaN }] } },
      'time.stages[0].duration',
      /./,
    ],
    [
      'a first step of nothing',
      { time: { stages: [{ ...day, firstStep: 0 }] } },
      'time.stages[0].firstStep',
      /./,
    ],
    [
      'shrinking steps',
      { time: { stages: [{ ...day, growth: 0.9 }] } },
      'time.stages[0].growth',
      /1 or more/,
    ],
    [
      'a largest step of nothing',
      { time: { stages: [{ ...day, largestStep: -1 }] } },
      'time.stages[0].largestStep',
      /./,
    ],
    [
      'steps without end',
      { time: { stages: [{ duration: 1e9, firstStep: 1e-3, growth: 1 }] } },
      'time.stages[0]',
      /steps/,
    ],
    [
      'a rate for three of two stages',
      { wells: [well(50, 50, [1, 2, 3])], time: { stages: [day, day] } },
      'wells[0].rate',
      /3 values for 2 stages/,
    ],
    [
      'recharge for one of two stages',
      { recharge: [{ name: 'Rain', rate: [0.001] }], time: { stages: [day, day] } },
      'recharge[0].rate',
      /1 values for 2 stages/,
    ],
    [
      'heads for one of two stages',
      { boundaries: [side('West', { stages: [12] })], time: { stages: [day, day] } },
      'boundaries[0].head.stages',
      /1 entries for 2 stages/,
    ],
    [
      'three vertices of two in the second stage',
      { boundaries: [side('West', { stages: [12, [12, 11, 10]] })], time: { stages: [day, day] } },
      'boundaries[0].head',
      /3 values for a line of 2/,
    ],
    [
      'leakage for three of two stages',
      { leakage: [{ name: 'Below', head: [1, 2, 3], leakance: 1e-3 }], time: { stages: [day, day] } },
      'leakage[0].head',
      /3 values/,
    ],
    [
      'a head that is no number in the second stage',
      { boundaries: [side('West', { stages: [12, Number.NaN] })], time: { stages: [day, day] } },
      'boundaries[0].head',
      /./,
    ],
    [
      'heads for 99 of 100 cells at the start',
      { time: { initialHead: Array.from({ length: 99 }, () => 11) } },
      'time.initialHead',
      /99 values for 100 cells/,
    ],
    [
      'no head in one cell of the ground at the start',
      { time: { initialHead: [...Array.from({ length: 99 }, () => 11), null] } },
      'time.initialHead[99]',
      /null where there is ground/,
    ],
    ['a head at the start that is no number', { time: { initialHead: Number.NaN } }, 'time.initialHead', /./],
    ['no storage in confined ground', { materials: [sand] }, 'materials[0].specificStorage', /"Sand" needs/],
    [
      'no yield in unconfined ground',
      { materials: [sand], flow: 'unconfined' },
      'materials[0].specificYield',
      /"Sand" needs/,
    ],
    [
      'a yield of more than everything',
      { materials: [{ ...sand, specificStorage: 1e-4, specificYield: 1.2 }], flow: 'unconfined' },
      'materials[0].specificYield',
      /at most 1/,
    ],
    [
      'a storage below nothing',
      { materials: [{ ...sand, specificStorage: -1e-4 }] },
      'materials[0].specificStorage',
      /./,
    ],
    [
      'steady heads at the start that nothing holds',
      { boundaries: [], time: { initialHead: 'steady' } },
      'boundaries',
      /./,
    ],
  ])('%s: refused, with the place', (_, changes, path, message) => {
    const error = refusal(site(changes))
    expect(error.path.startsWith(path)).toBe(true)
    expect(error.message).toMatch(message)
  })

  it('a site where nothing happens stays as it is', () => {
    const { heads, result } = solved(site({ boundaries: [], time: { stages: [day, { duration: 1e6 }] } }))
    expect(
      largestDifference(
        heads,
        Float64Array.from({ length: 100 }, () => 11.5),
      ),
    ).toBe(0)
    expect(result.balance.errorPercent).toEqual([0, 0])
  })

  it('holes in the heads at the start are left out where there is no ground', () => {
    const hole: Position[] = [
      [0, 0],
      [100, 0],
      [100, 50],
      [0, 50],
    ]
    const initialHead = Array.from({ length: 100 }, (_, cell) => (cell < 50 ? 11 : null))
    const { heads } = solved(
      site({ ground: [{ material: 'Sand', polygon: hole, base: 0, top: 10 }], time: { initialHead } }),
    )
    expect(heads.filter((head) => Number.isNaN(head))).toHaveLength(50)
  })

  it('one row, one column, one cell, a stage of a blink and one of an age: all get their answer', () => {
    for (const grid of [
      { columns: 40, rows: 1 },
      { columns: 1, rows: 40 },
      { columns: 1, rows: 1 },
    ]) {
      for (const by of ['sor', 'multigrid'] as const) {
        const stages: Stage[] = [{ duration: 1e-9 }, { duration: 1e9, firstStep: 0.1, growth: 2 }]
        const { heads } = solved(site({ grid, time: { stages }, solver: { method: by } }))
        const last = heads[heads.length - 1] as number
        expect(last).toBeGreaterThan(10.9)
        expect(last).toBeLessThan(12)
      }
    }
  })

  it('dry ground at the start wets as the river rises and dries again after it', () => {
    const { fields, result } = solved(
      site({
        flow: 'unconfined',
        ground: [{ material: 'Sand', base: 0 }],
        boundaries: [side('West', { stages: [6, 0.05] })],
        time: { initialHead: 0.001, stages: [{ duration: 300 }, { duration: 20_000 }] },
      }),
    )
    const [, wet, drained] = fields.map(({ heads }) => heads[9] as number) as [number, number, number]
    expect(wet).toBeGreaterThan(4)
    expect(drained).toBeLessThan(0.2)
    expect(Math.min(...(fields[2]?.heads ?? []))).toBeGreaterThan(0)
    for (const percent of result.balance.errorPercent) expect(Math.abs(percent)).toBeLessThan(1e-4)
  })

  it('a cancelled run stops within a step and says that it is not converged', () => {
    let calls = 0
    const solution = solveModel(
      site({
        grid: { columns: 60, rows: 60 },
        time: { stages: [{ duration: 100, firstStep: 0.01, growth: 1 }] },
      }),
      {
        isCancelled: () => ++calls > 30,
      },
    )
    expect(solution.cancelled).toBe(true)
    expect(solution.result.converged).toBe(false)
    expect(solution.result.warnings.map(({ code }) => code)).toContain('cancelled')
  })
})
