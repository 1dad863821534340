import { describe, expect, it } from 'vitest'
import type { Row } from '~/book/row'
import { type Material, materialSchema, pointSchema, type Zone, zoneSchema } from '~/ground/ground'
import { boundarySchema, rechargeZoneSchema, wallSchema, wellSchema } from '~/water/water'
import { caseSchema } from './case'
import { type CaseInputs, freezeCase } from './freeze'
import { parseModelFile } from './model-file'
import { modelHash } from './model-hash.server'

function row<Body>(id: string, kind: string, body: Body): Row<Body> {
  return {
    id,
    version: 1,
    kind,
    position: 1,
    body,
    recordedFrom: '2026-01-01T00:00:00Z',
    recordedBy: 'R. O.',
  }
}
const m = (value: number) => ({ value, unit: 'm' })
const material = (over: object = {}): Row<Material> =>
  row(
    'sand',
    'material',
    materialSchema.parse({
      name: 'Sand',
      kx: { value: 12, unit: 'm/d' },
      ky: { value: 12, unit: 'm/d' },
      source: 'Pumping test PT-1',
      ...over,
    }),
  )
const zone = (over: object = {}): Row<Zone> =>
  row(
    'zone',
    'zone',
    zoneSchema.parse({ name: 'Everywhere', materialId: 'sand', base: m(-10), top: m(0), ...over }),
  )
const well = (id: string, over: object = {}) =>
  row(
    id,
    'well',
    wellSchema.parse({
      name: id,
      x: 500,
      y: 300,
      kind: 'abstraction',
      rate: { value: 900, unit: 'm3/d' },
      ...over,
    }),
  )
const boundary = (id: string, over: object = {}) =>
  row(
    id,
    'boundary',
    boundarySchema.parse({
      name: id,
      kind: 'fixed head',
      line: [
        [0, 0],
        [0, 600],
      ],
      levels: [m(12)],
      ...over,
    }),
  )
const calcCase = (id: string, over: object = {}) => row(id, 'case', caseSchema.parse({ name: id, ...over }))
const base = (over: object = {}) =>
  calcCase('Base case', {
    isBase: true,
    flow: 'confined',
    extent: { xMin: 0, xMax: 1000, yMin: 0, yMax: 600 },
    cellSize: m(5),
    ...over,
  })

function book(over: Partial<CaseInputs> = {}): CaseInputs {
  return {
    project: {
      number: 'P-1',
      title: 'North basin',
      crsEpsg: 27700,
      verticalDatum: 'm above site datum',
      units: { length: 'm', time: 'd' },
    },
    materials: [material()],
    zones: [zone()],
    points: [],
    wells: [],
    rechargeZones: [],
    boundaries: [boundary('West')],
    walls: [],
    cases: [base()],
    ...over,
  }
}

function frozen(inputs: CaseInputs, caseId = 'Base case') {
  const answer = freezeCase(inputs, caseId)
  if (!answer.ok)
    throw new Error(answer.problems.map((p) => `${p.section} ${p.row}: ${p.message}`).join('\n'))
  return answer.frozen
}
function problems(inputs: CaseInputs, caseId = 'Base case') {
  const answer = freezeCase(inputs, caseId)
  return answer.ok ? [] : answer.problems
}

describe('A frozen case', () => {
  const full = book({
    points: [
      row('p1', 'point', pointSchema.parse({ name: 'P1', x: 120, y: 80, source: 'Setting out drawing 12' })),
    ],
    wells: [
      well('W1', {
        radius: { value: 150, unit: 'mm' },
        lowestLevel: m(-8),
        screenTop: m(-1.5),
        screenBottom: { value: -9000, unit: 'mm' },
      }),
    ],
    rechargeZones: [
      row(
        'field',
        'recharge zone',
        rechargeZoneSchema.parse({ name: 'Field', rate: { value: 0.8, unit: 'mm/d' } }),
      ),
    ],
    boundaries: [
      boundary('West', { outer: true }),
      boundary('River', {
        kind: 'head-dependent flux',
        levels: [m(10), m(9.5)],
        conductance: { value: 2, unit: 'm/d' },
        disconnectsBelow: m(8),
        line: [
          [1000, 0],
          [1000, 600],
        ],
      }),
      boundary('Ditch', {
        kind: 'drain',
        levels: [m(9)],
        conductance: { value: 5, unit: 'm/d' },
        line: [
          [300, 0],
          [300, 200],
        ],
      }),
      boundary('Valley side', {
        kind: 'specified flux',
        levels: null,
        flux: { value: 0.05, unit: 'm3/d/m' },
        direction: 'out of the model',
        line: [
          [0, 600],
          [1000, 600],
        ],
      }),
    ],
    walls: [
      row(
        'wall',
        'wall',
        wallSchema.parse({
          name: 'Cut-off',
          line: [
            [400, 200],
            [600, 200],
          ],
          thickness: m(0.8),
          k: { value: 1e-4, unit: 'm/d' },
          toe: { value: -850, unit: 'cm' },
        }),
      ),
    ],
  })

  it('is a model file that reads back as itself, with the same hash', () => {
    const { model } = frozen(full)
    const parsed = parseModelFile(JSON.parse(JSON.stringify(model)))
    expect(parsed).toEqual({ ok: true, model })
    expect(modelHash(parsed.ok && parsed.model)).toBe(modelHash(model))
  })

  it('holds each row with its number as entered, converted where the unit is another, and its source', () => {
    const { model } = frozen(full)
    expect(model.grid).toEqual({ columns: 200, rows: 120 })
    expect(model.materials).toEqual([{ name: 'Sand', kx: 12, ky: 12, source: 'Pumping test PT-1' }])
    expect(model.wells).toEqual([
      {
        name: 'W1',
        x: 500,
        y: 300,
        kind: 'abstraction',
        rate: 900,
        radius: 0.15,
        lowestLevel: -8,
        screen: { top: -1.5, bottom: -9 },
      },
    ])
    expect(model.recharge).toEqual([{ name: 'Field', rate: expect.closeTo(0.0008, 15) }])
    expect(model.points?.[0]?.source).toBe('Setting out drawing 12')
    expect(model.walls?.[0]).toMatchObject({ name: 'Cut-off', thickness: 0.8, k: 1e-4, toe: -8.5 })
  })

  it('gives each kind of boundary its own fields, levels one a line or one a vertex, and a flux its sign', () => {
    const [west, river, ditch, side] = frozen(full).model.boundaries ?? []
    expect(west).toMatchObject({ kind: 'fixed head', head: 12, outer: true })
    expect(river).toMatchObject({
      kind: 'head-dependent flux',
      head: [10, 9.5],
      conductance: 2,
      disconnectsBelow: 8,
    })
    expect(ditch).toMatchObject({ kind: 'drain', level: 9, conductance: 5 })
    expect(side).toMatchObject({ kind: 'specified flux', flux: -0.05 })
    expect(river).not.toHaveProperty('outer')
  })

  it('is in feet when the project is, whatever units its rows were entered in', () => {
    const { model } = frozen({
      ...full,
      project: { ...full.project, units: { length: 'ft', time: 'd' } },
    })
    expect(model.units).toEqual({ length: 'ft', time: 'd' })
    expect(model.ground[0]?.base).toBeCloseTo(-10 / 0.3048, 10)
    expect(model.wells?.[0]?.rate).toBeCloseTo(900 / 0.3048 ** 3, 6)
    expect(model.boundaries?.[3]).toMatchObject({ flux: expect.closeTo(-0.05 / 0.3048 ** 2, 10) })
  })

  it('is solved by the method of the case, of the base case, or else automatically', () => {
    const methodOf = (inBase: string | null, own: string | null) =>
      frozen({ ...full, cases: [base({ method: inBase }), calcCase('Other', { method: own })] }, 'Other')
        .model.solver?.method
    expect(methodOf(null, null)).toBe('automatic')
    expect(methodOf('sor', null)).toBe('sor')
    expect(methodOf('sor', 'multigrid')).toBe('multigrid')
  })

  it('asks for a verification unless the case, or the base case, leaves it out', () => {
    const wanted = (inBase: boolean | null, own: boolean | null) =>
      frozen({ ...full, cases: [base({ verify: inBase }), calcCase('Other', { verify: own })] }, 'Other')
        .model.want
    expect(wanted(null, null)).toEqual({ verify: true })
    expect(wanted(false, null)).toBeUndefined()
    expect(wanted(false, true)).toEqual({ verify: true })
    expect(wanted(true, false)).toBeUndefined()
  })

  it('says nothing of a toe or a screen that nobody gave', () => {
    const { model } = frozen({
      ...full,
      wells: [well('W1')],
      walls: full.walls.map((one) => ({ ...one, body: { ...one.body, toe: null } })),
    })
    expect(model.walls?.[0]).not.toHaveProperty('toe')
    expect(model.wells?.[0]).not.toHaveProperty('screen')
  })

  it('takes from the base case what it leaves blank, and its own values for the rest', () => {
    const wetter = calcCase('Wet year', {
      flow: 'unconfined',
      overrides: [
        { rowId: 'W1', quantity: 'rate', value: { value: 1200, unit: 'm3/d' } },
        { rowId: 'field', quantity: 'recharge', value: { value: 2e-3, unit: 'm/d' } },
        { rowId: 'wall', quantity: 'k', value: { value: 0, unit: 'm/d' } },
        { rowId: 'River', quantity: 'level', value: m(11) },
        { rowId: 'Valley side', quantity: 'flux', value: { value: 0.1, unit: 'm3/d/m' } },
        { rowId: 'sand', quantity: 'k', value: { value: 30, unit: 'm/d' } },
      ],
    })
    const { model } = frozen({ ...full, cases: [base(), wetter] }, 'Wet year')
    expect(model.flow).toBe('unconfined')
    expect(model.extent).toEqual({ x: [0, 1000], y: [0, 600] })
    expect(model.wells?.[0]?.rate).toBe(1200)
    expect(model.recharge?.[0]?.rate).toBe(2e-3)
    expect(model.walls?.[0]?.k).toBe(0)
    expect(model.boundaries?.[1]).toMatchObject({ head: 11 })
    expect(model.boundaries?.[3]).toMatchObject({ flux: -0.1 })
    expect(model.materials[0]).toMatchObject({ kx: 30, ky: 30 })
    expect(frozen({ ...full, cases: [base(), wetter] }).model.wells?.[0]?.rate).toBe(900)
  })

  it('keeps the ratio of ky to kx when a case sets the conductivity of a material', () => {
    const layered = material({ ky: { value: 3, unit: 'm/d' } })
    const low = calcCase('Low K', {
      overrides: [{ rowId: 'sand', quantity: 'k', value: { value: 4, unit: 'm/d' } }],
    })
    expect(
      frozen(book({ materials: [layered], cases: [base(), low] }), 'Low K').model.materials[0],
    ).toMatchObject({ kx: 4, ky: 1 })
  })

  it('leaves out a point beyond the extent, and says so', () => {
    const far = row('p9', 'point', pointSchema.parse({ name: 'P9', x: 5000, y: 0 }))
    const { model, outside, notices } = frozen(book({ points: [far] }))
    expect(model.points).toEqual([])
    expect(outside).toEqual([{ rowId: 'p9', name: 'P9', x: 5000, y: 0 }])
    expect(notices.map((notice) => notice.row)).toEqual(['P9'])
  })

  it('fits cells into an extent that is no whole multiple of the cell size', () => {
    const { grid } = frozen(book({ cases: [base({ cellSize: m(7) })] }))
    expect(grid.columns).toBe(143)
    expect(grid.columns * grid.width).toBeCloseTo(1000, 10)
  })
})

describe('What stands between the book and a run', () => {
  it('is named by section and row, all at once', () => {
    const found = problems(
      book({ materials: [], zones: [], boundaries: [], cases: [base(), calcCase('Other')] }),
      'Other',
    )
    expect(found.map((problem) => problem.section)).toEqual(['ground', 'ground', 'water'])
  })

  it('is a zone without a top level while flow is confined, and not while it is unconfined', () => {
    const open = book({ zones: [zone({ top: null })] })
    expect(problems(open)).toMatchObject([{ section: 'ground', row: 'Everywhere' }])
    expect(problems({ ...open, cases: [base({ flow: 'unconfined' })] })).toEqual([])
  })

  it('is a book whose boundaries hold no head anywhere', () => {
    const onlyFlux = boundary('Side', {
      kind: 'specified flux',
      levels: null,
      flux: { value: 1, unit: 'm3/d/m' },
    })
    expect(problems(book({ boundaries: [onlyFlux] }))[0]?.message).toMatch(/holds a head/)
  })

  it('is a well or a boundary beyond the extent', () => {
    const found = problems(
      book({
        wells: [well('W9', { x: 1001 })],
        boundaries: [
          boundary('West'),
          boundary('Elsewhere', {
            line: [
              [2000, 0],
              [2000, 600],
            ],
          }),
          boundary('Across', {
            line: [
              [-100, 300],
              [1100, 300],
            ],
          }),
        ],
      }),
    )
    expect(found.map((problem) => problem.row)).toEqual(['W9', 'Elsewhere'])
  })

  it('is more than a million cells', () => {
    expect(problems(book({ cases: [base({ cellSize: m(0.5) })] }))[0]?.message).toMatch(/too many/)
  })

  it('is two rows of one name, since results are listed by name', () => {
    expect(problems(book({ wells: [well('W1'), { ...well('W1', { x: 700 }), id: 'other' }] }))).toMatchObject(
      [{ section: 'water', row: 'W1', rowId: 'other' }],
    )
  })

  it('is a case that is no longer there', () => {
    expect(problems(book(), 'gone')).toMatchObject([{ section: 'cases' }])
  })
})

describe('What a run would do that may surprise', () => {
  it('is told of two wells in one cell', () => {
    const { notices } = frozen(book({ wells: [well('W1'), well('W2', { x: 503 })] }))
    expect(notices).toMatchObject([{ row: 'W2', message: expect.stringContaining('same cell as W1') }])
  })

  it('is told of a well within three cells of a fixed head, and not of one farther away', () => {
    expect(frozen(book({ wells: [well('W1', { x: 12 })] })).notices).toMatchObject([
      { row: 'W1', message: expect.stringContaining('2.4 cells from West') },
    ])
    expect(frozen(book({ wells: [well('W1', { x: 16 })] })).notices).toEqual([])
  })
})
