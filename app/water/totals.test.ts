import { describe, expect, it } from 'vitest'
import type { Row } from '~/book/row'
import { zoneSchema } from '~/ground/ground'
import { waterTotals } from './totals'
import { boundarySchema, rechargeZoneSchema, wallSchema, wellSchema } from './water'
import { wellRemarks } from './water-remarks'

function asRows<B>(bodies: B[]): Row<B>[] {
  return bodies.map((body, position) => ({
    id: String(position),
    version: 1,
    kind: 'row',
    position,
    body,
    recordedFrom: '',
    recordedBy: '',
  }))
}

const metric = { length: 'm', time: 'd' } as const

function well(name: string, kind: string, value: number, unit: string, at: [number, number] = [5, 5]) {
  return wellSchema.parse({ name, kind, rate: { value, unit }, x: at[0], y: at[1] })
}

const square: [number, number][] = [
  [0, 0],
  [100, 0],
  [100, 40],
  [0, 40],
]

describe('what section 3 carries forward', () => {
  const rows = {
    wells: asRows([
      well('W1', 'abstraction', 190, 'm3/d'),
      well('W2', 'abstraction', 1, 'l/s'),
      well('W3', 'recharge', 30, 'm3/d'),
    ]),
    rechargeZones: asRows([
      rechargeZoneSchema.parse({ name: 'Basin', rate: { value: 5, unit: 'mm/d' }, polygon: square }),
      rechargeZoneSchema.parse({ name: 'Rain', rate: { value: 300, unit: 'mm/a' } }),
    ]),
    boundaries: asRows([
      boundarySchema.parse({
        name: 'East',
        kind: 'specified flux',
        line: [
          [0, 0],
          [0, 200],
        ],
        flux: { value: 0.5, unit: 'm3/d/m' },
        direction: 'out of the model',
      }),
    ]),
    walls: asRows([
      wallSchema.parse({
        name: 'North',
        line: [
          [0, 0],
          [30, 40],
        ],
        thickness: { value: 0.8, unit: 'm' },
        k: { value: 0, unit: 'm/s' },
      }),
    ]),
  }

  it('adds up abstraction and recharge wells apart, in the unit of the project', () => {
    const totals = waterTotals(rows, metric)
    expect(totals.unit).toBe('m3/d')
    expect(totals.abstraction).toBeCloseTo(190 + 86.4, 10)
    expect(totals).toMatchObject({ abstractionWells: 2, recharge: 30, rechargeWells: 1 })
  })

  it('takes the volume of a recharge zone as area times rate, and none where it lies everywhere', () => {
    const [basin, rain] = waterTotals(rows, metric).volumes
    expect(basin?.area).toBe(4000)
    expect(basin?.volume).toBeCloseTo(4000 * 0.005, 10)
    expect(rain?.volume).toBeNull()
  })

  it('gives the same water in feet', () => {
    const feet = waterTotals(rows, { length: 'ft', time: 'd' })
    expect(feet.unit).toBe('ft3/d')
    expect(feet.abstraction * 0.3048 ** 3).toBeCloseTo(190 + 86.4, 8)
  })

  it('gives a specified flux out of the model a minus, and measures walls along their line', () => {
    expect(waterTotals(rows, metric)).toMatchObject({ specifiedFlux: -100, wallLength: 50 })
  })
})

describe('a well', () => {
  const zones = asRows([
    zoneSchema.parse({ name: 'Site', materialId: 'm', base: { value: -10, unit: 'm' }, polygon: square }),
  ])
  const river = boundarySchema.parse({
    name: 'River',
    kind: 'fixed head',
    line: [
      [0, 20],
      [100, 20],
    ],
    levels: [{ value: 1, unit: 'm' }],
  })

  it('never carries a sign: its kind says the direction', () => {
    expect(() => well('W1', 'abstraction', -5, 'm3/d')).toThrow('choose the kind')
  })

  it('outside every zone is remarked on', () => {
    const wells = asRows([
      well('In', 'abstraction', 5, 'm3/d', [50, 10]),
      well('Out', 'abstraction', 5, 'm3/d', [150, 10]),
    ])
    expect(Object.keys(wellRemarks(wells, { zones, boundaries: [], units: metric }))).toEqual(['1'])
  })

  it('on a fixed head line is remarked on, since the line would supply it', () => {
    const wells = asRows([
      well('Near', 'abstraction', 5, 'm3/d', [50, 20.3]),
      well('Far', 'abstraction', 5, 'm3/d', [50, 25]),
    ])
    const remarks = wellRemarks(wells, { zones, boundaries: asRows([river]), units: metric })
    expect(Object.keys(remarks)).toEqual(['0'])
    expect(remarks['0']?.[0]?.message).toContain('River')
  })
})
