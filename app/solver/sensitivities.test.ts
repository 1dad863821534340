import { describe, expect, it } from 'vitest'
import type { Boundary, Model } from './model'
import { namedValues } from './named-values'
import type { SensitivityResult } from './result'
import { solveModel } from './solve'

const asked = ['points/P1', 'points/P2', 'wells/W1', 'wells/W2', 'lines/Across', 'rings/Site/through']

/** A site with something of everything that a result can be sensitive to. */
function site(changes: Partial<Model> = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 200], y: [0, 120] },
    grid: { columns: 25, rows: 15 },
    time: { kind: 'steady' },
    materials: [
      { name: 'Sand', kx: 5, ky: 3 },
      { name: 'Gravel', kx: 40, ky: 40 },
    ],
    ground: [
      { material: 'Sand', base: 0, top: 12 },
      {
        material: 'Gravel',
        base: 0,
        top: 12,
        polygon: [
          [96, 0],
          [200, 0],
          [200, 64],
          [96, 64],
        ],
      },
    ],
    boundaries: [
      {
        name: 'West',
        kind: 'fixed head',
        line: [
          [0, 0],
          [0, 120],
        ],
        head: [9, 9.5],
      },
      {
        name: 'River',
        kind: 'head-dependent flux',
        line: [
          [200, 0],
          [200, 120],
        ],
        head: 7,
        conductance: 0.4,
      },
      {
        name: 'Ditch',
        kind: 'drain',
        line: [
          [60, 20],
          [60, 90],
        ],
        level: 6.5,
        conductance: 0.3,
      },
      {
        name: 'Slope',
        kind: 'specified flux',
        line: [
          [40, 120],
          [160, 120],
        ],
        flux: 0.05,
      },
      {
        name: 'Pond',
        kind: 'fixed head',
        polygon: [
          [150, 80],
          [170, 80],
          [170, 100],
          [150, 100],
        ],
        head: 7.5,
      },
    ],
    walls: [
      {
        name: 'Cut-off',
        line: [
          [96, 20],
          [96, 80],
        ],
        thickness: 0.6,
        k: 0.01,
      },
    ],
    leakage: [{ name: 'Aquitard', head: 8.4, leakance: 2e-4 }],
    recharge: [{ name: 'Rain', rate: 0.001 }],
    wells: [
      { name: 'W1', x: 121, y: 41, kind: 'abstraction', rate: 60, radius: 0.2 },
      { name: 'W2', x: 36, y: 60, kind: 'recharge', rate: 15 },
    ],
    points: [
      { name: 'P1', x: 85, y: 50 },
      { name: 'P2', x: 198, y: 33 },
    ],
    lines: [
      {
        name: 'Across',
        line: [
          [80, 0],
          [140, 120],
        ],
      },
    ],
    rings: [
      {
        name: 'Site',
        polygon: [
          [100, 20],
          [180, 20],
          [180, 70],
          [100, 70],
        ],
      },
    ],
    solver: { tolerance: 1e-12 },
    ...changes,
  }
}

function unconfined(): Model {
  const model = site()
  return site({
    flow: 'unconfined',
    ground: model.ground.map(({ top, ...entry }) => ({ ...entry, base: -2 })),
  })
}

function oblique(): Model {
  const model = site()
  return site({ materials: model.materials.map((material) => ({ ...material, angle: 30 })), walls: [] })
}

function section(): Model {
  const { wells, leakage, ...model } = site()
  return {
    ...model,
    kind: 'section',
    flow: 'saturated',
    ground: model.ground.map(({ base, top, ...entry }) => entry),
    boundaries: (model.boundaries ?? []).filter(({ name }) => name !== 'Ditch' && name !== 'Pond'),
  }
}

function valuesOf(model: Model): Map<string, number> {
  const { result } = solveModel(model)
  expect(result.converged).toBe(true)
  return new Map(namedValues(result).map(({ name, values }) => [name, values[0] as number]))
}

/** Central difference of every named result. */
function slopes(change: (by: number) => Model, step: number): Map<string, number> {
  const above = valuesOf(change(step))
  const below = valuesOf(change(-step))
  return new Map(
    [...above].map(([name, value]) => [name, (value - (below.get(name) as number)) / (2 * step)]),
  )
}

interface Probe {
  title: string
  step: number
  change: (model: Model, by: number) => Model
  found: (result: SensitivityResult) => number | undefined
}

const withBoundary = (model: Model, name: string, change: (boundary: Boundary) => Boundary): Model => ({
  ...model,
  boundaries: model.boundaries?.map((boundary) => (boundary.name === name ? change(boundary) : boundary)),
})

const rowOf = <Row extends { name: string }>(rows: Row[], name: string) =>
  rows.find((row) => row.name === name)

const probes: Probe[] = [
  ...['Sand', 'Gravel'].map(
    (name): Probe => ({
      title: `ln K of ${name}`,
      step: 1e-3,
      change: (model, by) => ({
        ...model,
        materials: model.materials.map((material) =>
          material.name === name
            ? { ...material, kx: material.kx * Math.exp(by), ky: material.ky * Math.exp(by) }
            : material,
        ),
      }),
      found: ({ materials }) => rowOf(materials, name)?.perLnK,
    }),
  ),
  {
    title: 'the rate of recharge',
    step: 1e-4,
    change: (model, by) => ({ ...model, recharge: [{ name: 'Rain', rate: 0.001 + by }] }),
    found: ({ recharge }) => rowOf(recharge, 'Rain')?.perRate,
  },
  {
    title: 'the head of a fixed-head side',
    step: 1e-3,
    change: (model, by) =>
      withBoundary(model, 'West', (own) => ({ ...own, kind: 'fixed head', head: [9 + by, 9.5 + by] })),
    found: ({ boundaries }) => rowOf(boundaries, 'West')?.perHead,
  },
  {
    title: 'the level of a pond that holds cells',
    step: 1e-3,
    change: (model, by) =>
      withBoundary(model, 'Pond', (own) => ({ ...own, kind: 'fixed head', head: 7.5 + by })),
    found: ({ boundaries }) => rowOf(boundaries, 'Pond')?.perHead,
  },
  {
    title: 'the conductance of a river bed',
    step: 1e-3,
    change: (model, by) =>
      withBoundary(model, 'River', (own) => ({
        ...own,
        kind: 'head-dependent flux',
        head: 7,
        conductance: 0.4 * Math.exp(by),
      })),
    found: ({ boundaries }) => rowOf(boundaries, 'River')?.perLnConductance,
  },
  {
    title: 'the level of a drain',
    step: 1e-3,
    change: (model, by) =>
      withBoundary(model, 'Ditch', (own) => ({ ...own, kind: 'drain', level: 6.5 + by, conductance: 0.3 })),
    found: ({ boundaries }) => rowOf(boundaries, 'Ditch')?.perHead,
  },
  {
    title: 'a specified flux',
    step: 1e-3,
    change: (model, by) =>
      withBoundary(model, 'Slope', (own) => ({ ...own, kind: 'specified flux', flux: 0.05 + by })),
    found: ({ boundaries }) => rowOf(boundaries, 'Slope')?.perFlux,
  },
  {
    title: 'ln k of a wall',
    step: 1e-3,
    change: (model, by) => ({
      ...model,
      walls: model.walls?.map((wall) => ({ ...wall, k: wall.k * Math.exp(by) })),
    }),
    found: ({ walls }) => rowOf(walls, 'Cut-off')?.perLnK,
  },
  {
    title: 'the head above an aquitard',
    step: 1e-3,
    change: (model, by) => ({ ...model, leakage: [{ name: 'Aquitard', head: 8.4 + by, leakance: 2e-4 }] }),
    found: ({ leakage }) => rowOf(leakage, 'Aquitard')?.perHead,
  },
  {
    title: 'ln of its leakance',
    step: 1e-3,
    change: (model, by) => ({
      ...model,
      leakage: [{ name: 'Aquitard', head: 8.4, leakance: 2e-4 * Math.exp(by) }],
    }),
    found: ({ leakage }) => rowOf(leakage, 'Aquitard')?.perLnLeakance,
  },
  ...['W1', 'W2'].map(
    (name): Probe => ({
      title: `the rate of ${name}`,
      step: 0.05,
      change: (model, by) => ({
        ...model,
        wells: model.wells?.map((well) =>
          well.name === name ? { ...well, rate: (well.rate as number) + by } : well,
        ),
      }),
      found: ({ wells }) => rowOf(wells, name)?.perRate,
    }),
  ),
]

describe.each([
  ['confined ground', site()],
  ['unconfined ground', unconfined()],
  ['ground askew to the grid', oblique()],
  ['a saturated section', section()],
])('sensitivities and responses in %s', (_, model) => {
  const names = asked.filter((name) => model.wells || !name.startsWith('wells/'))
  const { result, pictures } = solveModel({ ...model, want: { sensitivities: names, responses: true } })
  const found = result.sensitivities ?? []
  const applies = probes.filter(({ found: of }) => found[0] && of(found[0]) !== undefined)

  it.each(applies.map((probe) => [probe.title, probe] as const))(
    'are those of central differences: %s',
    (__, { change, step, found: of }) => {
      const known = slopes((by) => change(model, by), step)
      const largest = (kind: string) =>
        Math.max(...[...known].filter(([name]) => name.startsWith(kind)).map(([, value]) => Math.abs(value)))
      for (const entry of found) {
        const value = of(entry) as number
        const difference = known.get(entry.name) as number
        // Heads are judged among heads and flows among flows; what is next to nothing of them is rounding.
        const others = /^(lines|rings)/.test(entry.name) ? ['lines', 'rings'] : ['points', 'wells']
        const scale = Math.max(Math.abs(difference), 1e-3 * Math.max(...others.map(largest)))
        expect(Math.abs(value - difference)).toBeLessThan(1e-4 * scale)
      }
    },
  )

  it('a well response is the same derivative, by the way forward', () => {
    for (const response of result.responses ?? []) {
      for (const entry of found) {
        const change = response.results.find(({ name }) => name === entry.name)?.change as number
        const adjoint = rowOf(entry.wells, response.well)?.perRate as number
        expect(Math.abs(change - adjoint)).toBeLessThan(1e-5 * Math.max(Math.abs(adjoint), 1e-6))
      }
    }
    expect(result.responses?.length).toBe(model.wells?.length ?? 0)
  })

  it('what ln K of all cells is worth together is what ln K of the materials is', () => {
    const worth = ({ materials }: (typeof found)[number]) =>
      materials.reduce((sum, { perLnK }) => sum + Math.abs(perLnK), 0)
    for (const entry of found) {
      const field = pictures.sensitivities?.get(entry.name)
      if (!field) {
        expect(model.materials[0]?.angle).toBe(30)
        continue
      }
      const cells = field.reduce((sum, value) => sum + value, 0)
      const materials = entry.materials.reduce((sum, { perLnK }) => sum + perLnK, 0)
      // Heads among heads, flows among flows, as above: a ring without sources has no flow that K could change.
      const others = found.filter(
        ({ name }) => /^(lines|rings)/.test(name) === /^(lines|rings)/.test(entry.name),
      )
      const scale = Math.max(worth(entry), 1e-8 * Math.max(...others.map(worth)))
      // The correction at a wall's end knows K too, which the field leaves out; unconfined levels at faces move.
      expect(Math.abs(cells - materials)).toBeLessThan((model.flow === 'unconfined' ? 0.02 : 0.005) * scale)
    }
  })
})

describe('what is asked for', () => {
  it('a result that is not there is refused by name', () => {
    expect(() => solveModel(site({ want: { sensitivities: ['points/P9'] } }))).toThrow(
      /no result "points\/P9"/,
    )
  })
})
