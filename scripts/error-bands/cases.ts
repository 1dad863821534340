/**
 * Random calculation cases whose answer is known in closed form: what the error bands of a verified run are held
 * against. Seeded: the same number gives the same case on every machine.
 */
import { formulaOf } from '~/solver/formulas/compare'
import { meanRound } from '~/solver/formulas/formula'
import { besselK0, wellFunction } from '~/solver/formulas/special-functions'
import type { Boundary, Model, Point, Position, Well } from '~/solver/model'

export interface KnownCase {
  kind: string
  model: Model
  /** The true value of named results: "points/P1", "wells/W1", "lines/Across", "rings/Round W1/through". */
  truth: Record<string, number>
}

interface Chance {
  /** Evenly between the two. */
  between: (low: number, high: number) => number
  /** Evenly in the logarithm. */
  scale: (low: number, high: number) => number
  whole: (low: number, high: number) => number
  one: <T>(of: T[]) => T
}

/** Mulberry32: 32 bits of state, mixed by multiplication and shifts. */
function chanceFrom(seed: number): Chance {
  let state = seed >>> 0
  function next(): number {
    state = (state + 0x6d2b79f5) >>> 0
    let t = Math.imul(state ^ (state >>> 15), 1 | state)
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296
  }
  const between = (low: number, high: number) => low + (high - low) * next()
  return {
    between,
    scale: (low, high) => Math.exp(between(Math.log(low), Math.log(high))),
    whole: (low, high) => Math.floor(between(low, high + 1)),
    one: (of) => of[Math.floor(next() * of.length)] as (typeof of)[number],
  }
}

const kinds: ((chance: Chance) => KnownCase)[] = [
  confinedStrip,
  unconfinedStrip,
  wellsInRectangle,
  wellsInRectangle,
  unconfinedWell,
  wellInUniformFlow,
  leakyWell,
  zonesInSeries,
  growingCone,
  slopingWaterTable,
]

/** Case `number` of the series that `seed` begins; the kinds take turns. */
export function knownCase(seed: number, number: number): KnownCase {
  const chance = chanceFrom(seed * 1_000_003 + number)
  return (kinds[number % kinds.length] as (typeof kinds)[number])(chance)
}

function plan(rest: Partial<Model> & Pick<Model, 'extent' | 'grid' | 'materials' | 'ground'>): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    time: { kind: 'steady' },
    want: { verify: true },
    ...rest,
  }
}

type SideName = 'west' | 'east' | 'south' | 'north'

function sideLine({ x, y }: Model['extent'], name: SideName): Position[] {
  const corner = { west: [0, 0, 0, 1], east: [1, 0, 1, 1], south: [0, 0, 1, 0], north: [0, 1, 1, 1] }[name]
  const [a, b, c, d] = corner as [0 | 1, 0 | 1, 0 | 1, 0 | 1]
  return [
    [x[a], y[b]],
    [x[c], y[d]],
  ]
}

function held(extent: Model['extent'], name: SideName, head: number): Boundary {
  return { name, kind: 'fixed head', line: sideLine(extent, name), head }
}

/** All sides held at the heads of a formula, two hundred vertices a side. */
function heldByFormula(extent: Model['extent'], headAt: (x: number, y: number) => number): Boundary[] {
  return (['west', 'east', 'south', 'north'] as const).map((name) => {
    const [a, b] = sideLine(extent, name) as [Position, Position]
    const line = Array.from(
      { length: 201 },
      (_, k): Position => [a[0] + ((b[0] - a[0]) * k) / 200, a[1] + ((b[1] - a[1]) * k) / 200],
    )
    return { name, kind: 'fixed head', line, head: line.map(([x, y]) => headAt(x, y)) }
  })
}

/** Points anywhere in the extent, but at least `apart` from every well. */
function somePoints(
  chance: Chance,
  { x, y }: Model['extent'],
  wells: Well[],
  apart: number,
  count = 3,
): Point[] {
  const points: Point[] = []
  while (points.length < count) {
    const at = { x: chance.between(x[0], x[1]), y: chance.between(y[0], y[1]) }
    if (wells.some((well) => Math.hypot(well.x - at.x, well.y - at.y) < apart)) continue
    points.push({ name: `P${points.length + 1}`, ...at })
  }
  return points
}

function someWells(
  chance: Chance,
  { x, y }: Model['extent'],
  count: number,
  most: number,
  apart: number,
): Well[] {
  const wells: Well[] = []
  // Where there is no room for one more, fewer will do.
  for (let tries = 0; wells.length < count && tries < 300; tries++) {
    const [u, v] = [chance.between(0.2, 0.8), chance.between(0.2, 0.8)]
    const at = { x: x[0] + u * (x[1] - x[0]), y: y[0] + v * (y[1] - y[0]) }
    if (wells.some((well) => Math.hypot(well.x - at.x, well.y - at.y) < apart)) continue
    const rate = chance.between(0.3, 1) * most
    wells.push({ name: `W${wells.length + 1}`, ...at, kind: 'abstraction', rate, radius: 0.15 })
  }
  return wells
}

/** Heads at all points, and at all wells' faces, by the formula that the program itself finds for the model. */
function headsByFormula(model: Model): Record<string, number> {
  const formula = formulaOf(model)
  if (!formula) throw new Error('no formula holds for a case that was made for one')
  const truth: Record<string, number> = {}
  for (const { name, x, y } of model.points ?? []) {
    truth[`points/${name}`] = formula.headAt(x, y, 0) ?? Number.NaN
  }
  const headAt = (x: number, y: number) => formula.headAt(x, y, 0) ?? Number.NaN
  for (const { name, x, y, radius } of model.wells ?? []) {
    if (radius) truth[`wells/${name}`] = meanRound(x, y, radius, headAt)
  }
  return truth
}

/** One-dimensional confined flow between two sides, with recharge; the discharge across a line somewhere between. */
function confinedStrip(chance: Chance): KnownCase {
  const length = chance.scale(100, 3000)
  const extent: Model['extent'] = { x: [0, length], y: [0, length / 2] }
  const transmissivity = chance.scale(5, 2000)
  const [west, east] = [chance.between(5, 25), chance.between(5, 25)]
  const rate = chance.one([0, chance.scale(1e-4, 3e-3)])
  const at = chance.between(0.1, 0.9) * length
  const model = plan({
    extent,
    grid: { columns: chance.whole(10, 40), rows: chance.whole(8, 12) },
    materials: [{ name: 'Sand', kx: transmissivity / 10, ky: transmissivity / 10 }],
    ground: [{ material: 'Sand', base: -1010, top: -1000 }],
    recharge: rate > 0 ? [{ name: 'Rain', rate }] : [],
    boundaries: [held(extent, 'west', west), held(extent, 'east', east)],
    points: somePoints(chance, extent, [], 0),
    lines: [
      {
        name: 'Across',
        line: [
          [at, length / 2],
          [at, 0],
        ],
      },
    ],
  })
  const discharge = (transmissivity * (west - east)) / length - rate * (length / 2 - at)
  return {
    kind: 'strip',
    model,
    truth: { ...headsByFormula(model), 'lines/Across': (discharge * length) / 2 },
  }
}

/** The same unconfined, by Dupuit. */
function unconfinedStrip(chance: Chance): KnownCase {
  const length = chance.scale(100, 1500)
  const extent: Model['extent'] = { x: [0, length], y: [0, length / 2] }
  const k = chance.scale(0.5, 100)
  const [west, east] = [chance.between(4, 20), chance.between(4, 20)]
  const rate = chance.one([0, chance.scale(1e-4, 3e-3)])
  const at = chance.between(0.1, 0.9) * length
  const model = plan({
    extent,
    flow: 'unconfined',
    grid: { columns: chance.whole(10, 40), rows: chance.whole(8, 12) },
    materials: [{ name: 'Sand', kx: k, ky: k }],
    ground: [{ material: 'Sand', base: 0 }],
    recharge: rate > 0 ? [{ name: 'Rain', rate }] : [],
    boundaries: [held(extent, 'west', west), held(extent, 'east', east)],
    points: somePoints(chance, extent, [], 0),
    lines: [
      {
        name: 'Across',
        line: [
          [at, length / 2],
          [at, 0],
        ],
      },
    ],
  })
  const discharge = (k * (west ** 2 - east ** 2)) / (2 * length) - rate * (length / 2 - at)
  return {
    kind: 'unconfined strip',
    model,
    truth: { ...headsByFormula(model), 'lines/Across': (discharge * length) / 2 },
  }
}

/** One to three wells in a rectangle, one to four of its sides held, the others closed; a ring round the first. */
function wellsInRectangle(chance: Chance): KnownCase {
  const extent: Model['extent'] = { x: [0, chance.between(200, 800)], y: [0, chance.between(200, 800)] }
  const [columns, rows] = [chance.whole(16, 40), chance.whole(16, 40)]
  const cell = Math.max(extent.x[1] / columns, extent.y[1] / rows)
  const transmissivity = chance.scale(20, 2000)
  const wells = someWells(chance, extent, chance.whole(1, 3), transmissivity * 2, 5 * cell)
  const names = (['west', 'east', 'south', 'north'] as const).filter(() => chance.between(0, 1) < 0.6)
  const head = chance.between(10, 30)
  const first = wells[0] as Well
  const reach = 2.2 * cell
  const model = plan({
    extent,
    grid: { columns, rows },
    materials: [{ name: 'Sand', kx: transmissivity / 10, ky: transmissivity / 10 }],
    ground: [{ material: 'Sand', base: -1010, top: -1000 }],
    boundaries: (names.length > 0 ? names : (['west'] as const)).map((name) => held(extent, name, head)),
    wells,
    points: somePoints(chance, extent, wells, 1.5 * cell),
    rings: [
      {
        name: 'Round W1',
        polygon: [
          [first.x - reach, first.y - reach],
          [first.x + reach, first.y - reach],
          [first.x + reach, first.y + reach],
          [first.x - reach, first.y + reach],
        ],
      },
    ],
  })
  return {
    kind: 'wells in a rectangle',
    model,
    truth: { ...headsByFormula(model), 'rings/Round W1/through': first.rate as number },
  }
}

/** A well in unconfined ground, in a rectangle with all or two of its sides held. */
function unconfinedWell(chance: Chance): KnownCase {
  const extent: Model['extent'] = { x: [0, chance.between(200, 800)], y: [0, chance.between(200, 800)] }
  const [columns, rows] = [chance.whole(16, 40), chance.whole(16, 40)]
  const cell = Math.max(extent.x[1] / columns, extent.y[1] / rows)
  const k = chance.scale(2, 100)
  const head = chance.between(8, 20)
  // So that the level at the well's face stays above a third of that outside.
  const most = (0.4 * Math.PI * k * head ** 2) / Math.log(extent.x[1] / 0.15)
  const wells = someWells(chance, extent, 1, most, 0)
  const names: SideName[] = chance.one([
    ['west', 'east', 'south', 'north'],
    ['west', 'east'],
    ['south', 'north'],
  ])
  const model = plan({
    extent,
    flow: 'unconfined',
    grid: { columns, rows },
    materials: [{ name: 'Sand', kx: k, ky: k }],
    ground: [{ material: 'Sand', base: 0 }],
    boundaries: names.map((name) => held(extent, name, head)),
    wells,
    points: somePoints(chance, extent, wells, 1.5 * cell),
  })
  return { kind: 'unconfined well', model, truth: headsByFormula(model) }
}

/** A well in uniform flow in endless ground, cut out along a rectangle whose sides are held at the formula's heads. */
function wellInUniformFlow(chance: Chance): KnownCase {
  const half = chance.between(150, 500)
  const extent: Model['extent'] = { x: [-half, half], y: [-half, half] }
  const count = chance.whole(16, 40)
  const transmissivity = chance.scale(20, 2000)
  const gradient = chance.between(0.001, 0.01)
  const rate = chance.between(0.3, 2) * transmissivity
  const well: Well = {
    name: 'W1',
    x: chance.between(-0.4, 0.4) * half,
    y: chance.between(-0.4, 0.4) * half,
    kind: 'abstraction',
    rate,
    radius: 0.15,
  }
  const headAt = (x: number, y: number) =>
    20 +
    gradient * x +
    (rate / (2 * Math.PI * transmissivity)) * Math.log(Math.hypot(x - well.x, y - well.y) / half)
  const model = plan({
    extent,
    grid: { columns: count, rows: count },
    materials: [{ name: 'Sand', kx: transmissivity / 10, ky: transmissivity / 10 }],
    ground: [{ material: 'Sand', base: -1010, top: -1000 }],
    boundaries: heldByFormula(extent, headAt),
    wells: [well],
    points: somePoints(chance, extent, [well], (3 * half) / count),
  })
  return { kind: 'well in uniform flow', model, truth: headsWith(model, headAt) }
}

function headsWith(model: Model, headAt: (x: number, y: number) => number): Record<string, number> {
  return Object.fromEntries([
    ...(model.points ?? []).map(({ name, x, y }) => [`points/${name}`, headAt(x, y)]),
    ...(model.wells ?? []).map(({ name, x, y, radius = 0 }) => [
      `wells/${name}`,
      meanRound(x, y, radius, headAt),
    ]),
  ])
}

/** A well in leaky ground, its sides held at the formula's heads. */
function leakyWell(chance: Chance): KnownCase {
  const half = chance.between(150, 500)
  const extent: Model['extent'] = { x: [-half, half], y: [-half, half] }
  const count = chance.whole(16, 40)
  const transmissivity = chance.scale(20, 2000)
  const length = chance.between(0.3, 1.5) * half
  const rate = chance.between(0.3, 2) * transmissivity
  const well: Well = { name: 'W1', x: 0.1 * half, y: -0.15 * half, kind: 'abstraction', rate, radius: 0.15 }
  const headAt = (x: number, y: number) =>
    20 - (rate / (2 * Math.PI * transmissivity)) * besselK0(Math.hypot(x - well.x, y - well.y) / length)
  const model = plan({
    extent,
    grid: { columns: count, rows: count },
    materials: [{ name: 'Sand', kx: transmissivity / 10, ky: transmissivity / 10 }],
    ground: [{ material: 'Sand', base: -1010, top: -1000 }],
    leakage: [{ name: 'Aquitard', head: 20, leakance: transmissivity / length ** 2 }],
    boundaries: heldByFormula(extent, headAt),
    wells: [well],
    points: somePoints(chance, extent, [well], (3 * half) / count),
  })
  return { kind: 'leaky ground', model, truth: headsWith(model, headAt) }
}

/** Three zones one behind the other, whose limits need not lie on cell faces. */
function zonesInSeries(chance: Chance): KnownCase {
  const length = chance.between(100, 1000)
  const extent: Model['extent'] = { x: [0, length], y: [0, length / 2] }
  const columns = chance.whole(16, 40)
  const onFaces = chance.between(0, 1) < 0.5
  const limits = [chance.between(0.2, 0.45), chance.between(0.55, 0.8)].map((share) =>
    onFaces ? (Math.round(share * columns) / columns) * length : share * length,
  ) as [number, number]
  const ks = [1, 2, 3].map(() => chance.scale(0.1, 100)) as [number, number, number]
  const [west, east] = [chance.between(10, 25), chance.between(10, 25)]
  const edges = [0, ...limits, length]
  const resistances = ks.map((k, zone) => ((edges[zone + 1] as number) - (edges[zone] as number)) / (10 * k))
  const flow = (west - east) / resistances.reduce((sum, one) => sum + one, 0)
  const headAt = (x: number) => {
    let head = west
    for (const [zone, k] of ks.entries()) {
      const passed = Math.min(x, edges[zone + 1] as number) - (edges[zone] as number)
      if (passed > 0) head -= (flow * passed) / (10 * k)
    }
    return head
  }
  const model = plan({
    extent,
    grid: { columns, rows: chance.whole(8, 12) },
    materials: ks.map((k, zone) => ({ name: `Zone ${zone + 1}`, kx: k, ky: k })),
    ground: ks.map((_, zone) => ({
      material: `Zone ${zone + 1}`,
      base: -1010,
      top: -1000,
      polygon: [
        [edges[zone] as number, 0],
        [edges[zone + 1] as number, 0],
        [edges[zone + 1] as number, length / 2],
        [edges[zone] as number, length / 2],
      ],
    })),
    boundaries: [held(extent, 'west', west), held(extent, 'east', east)],
    points: somePoints(chance, extent, [], 0),
    lines: [
      {
        name: 'Across',
        line: [
          [length / 2, length / 2],
          [length / 2, 0],
        ],
      },
    ],
  })
  const truth = { ...headsWith(model, headAt), 'lines/Across': (flow * length) / 2 }
  return { kind: 'zones in series', model, truth }
}

/** Theis: the growing cone of a well in confined ground, on a grid that widens away from it. */
function growingCone(chance: Chance): KnownCase {
  const transmissivity = chance.scale(50, 1000)
  const storage = chance.scale(1e-4, 1e-3)
  const days = chance.scale(0.02, 1)
  const reach = Math.sqrt((4 * transmissivity * days) / storage)
  const growth = chance.between(1.25, 1.35)
  const first = chance.between(0.02, 0.04) * reach
  const out: number[] = [first / 2]
  while ((out.at(-1) as number) < 3.2 * reach) out.push((out.at(-1) as number) + first * growth ** out.length)
  const edges = [...out.map((edge) => -edge).reverse(), ...out]
  const end = out.at(-1) as number
  const extent: Model['extent'] = { x: [-end, end], y: [-end, end] }
  const rate = chance.between(0.3, 2) * transmissivity
  const well: Well = { name: 'W1', x: 0, y: 0, kind: 'abstraction', rate, radius: 0.1 }
  const points: Point[] = [1, 2, 3].map((k) => {
    const r = chance.between(0.08, 0.6) * reach
    const angle = chance.between(0, 2 * Math.PI)
    return { name: `P${k}`, x: r * Math.cos(angle), y: r * Math.sin(angle) }
  })
  const headAt = (x: number, y: number) => {
    const u = ((x * x + y * y) * storage) / (4 * transmissivity * days)
    return 20 - (rate / (4 * Math.PI * transmissivity)) * wellFunction(u)
  }
  const model = plan({
    extent,
    grid: { xEdges: edges, yEdges: edges },
    time: {
      kind: 'transient',
      initialHead: 20,
      stages: [{ duration: days, firstStep: days * chance.scale(1e-3, 1e-2), growth: 1.3 }],
    },
    materials: [
      { name: 'Sand', kx: transmissivity / 10, ky: transmissivity / 10, specificStorage: storage / 10 },
    ],
    ground: [{ material: 'Sand', base: -1010, top: -1000 }],
    boundaries: (['west', 'east', 'south', 'north'] as const).map((name) => held(extent, name, 20)),
    wells: [well],
    points,
  })
  return { kind: 'growing cone', model, truth: headsWith(model, headAt) }
}

/** Flow in a vertical section under a water table that slopes evenly (Toth 1962). */
function slopingWaterTable(chance: Chance): KnownCase {
  const length = chance.between(300, 2000)
  const depth = chance.between(0.2, 0.6) * length
  const slope = chance.between(0.005, 0.05)
  const k = chance.scale(0.01, 10)
  const extent: Model['extent'] = { x: [0, length], y: [0, depth] }
  const headAt = (x: number, z: number) => {
    let sum = 0
    for (let n = 1; n < 4000; n += 2) {
      const m = (n * Math.PI) / length
      // cosh(m z) / cosh(m depth), without overflow.
      const ratio = (Math.exp(-m * (depth - z)) * (1 + Math.exp(-2 * m * z))) / (1 + Math.exp(-2 * m * depth))
      sum += (Math.cos(m * x) * ratio) / (n * n)
      if (ratio < 1e-16) break
    }
    return depth + (slope * length) / 2 - ((4 * slope * length) / Math.PI ** 2) * sum
  }
  let discharge = 0
  for (let n = 1; n < 200_000; n += 2) {
    const m = (n * Math.PI) / length
    discharge += (Math.sin((n * Math.PI) / 2) * Math.tanh(m * depth)) / (n * n)
  }
  discharge *= (-4 * slope * length * k) / Math.PI ** 2
  const model: Model = {
    ...plan({
      extent,
      grid: { columns: chance.whole(20, 50), rows: chance.whole(10, 30) },
      materials: [{ name: 'Sand', kx: k, ky: k }],
      ground: [{ material: 'Sand' }],
      boundaries: [
        {
          name: 'Water table',
          kind: 'fixed head',
          line: sideLine(extent, 'north'),
          head: [depth, depth + slope * length],
        },
      ],
      points: somePoints(chance, extent, [], 0),
      lines: [
        {
          name: 'Middle',
          line: [
            [length / 2, depth],
            [length / 2, 0],
          ],
        },
      ],
    }),
    kind: 'section',
    flow: 'saturated',
  }
  return {
    kind: 'sloping water table',
    model,
    truth: { ...headsWith(model, headAt), 'lines/Middle': discharge },
  }
}
