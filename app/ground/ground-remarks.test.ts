import { describe, expect, it } from 'vitest'
import type { Row } from '~/book/row'
import { materialSchema, zoneSchema } from './ground'
import { materialRemarks, zoneRemarks } from './ground-remarks'

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

function material(name: string, value: number, unit = 'm/s', more: object = {}) {
  return materialSchema.parse({ name, kx: { value, unit }, ky: { value, unit }, ...more })
}

describe('a material', () => {
  it('must have its conductivity inside its own stated range, whatever the units', () => {
    const body = { name: 'Sand', kx: { value: 1e-3, unit: 'm/s' }, ky: { value: 1e-3, unit: 'm/s' } }
    expect(materialSchema.safeParse({ ...body, kHigh: { value: 50, unit: 'm/d' } }).success).toBe(false)
    expect(materialSchema.safeParse({ ...body, kHigh: { value: 90, unit: 'm/d' } }).success).toBe(true)
  })

  it('is remarked on, not refused, when its conductivity looks like a slip of the unit', () => {
    const remarks = materialRemarks(asRows([material('Sand', 12), material('Clay', 1e-9)]))
    expect(remarks['0']?.map((remark) => remark.field)).toEqual(['kx', 'ky'])
    expect(remarks['1']).toBeUndefined()
  })

  it('is remarked on when another has its name', () => {
    const remarks = materialRemarks(asRows([material('Sand', 1e-4), material('sand ', 1e-5)]))
    expect(Object.keys(remarks)).toEqual(['0', '1'])
  })

  it('is remarked on when it yields more than its pores hold', () => {
    const remarks = materialRemarks(
      asRows([material('Sand', 1e-4, 'm/s', { specificYield: 0.3, porosity: 0.25 })]),
    )
    expect(remarks['0']?.[0]?.field).toBe('specificYield')
  })
})

describe('a zone', () => {
  const zone = { name: 'Site', materialId: 'm', base: { value: -10, unit: 'm' } }
  const square = [
    [0, 0],
    [10, 0],
    [10, 10],
    [0, 10],
  ]

  it('must have its top above its base, in whatever units they were entered', () => {
    expect(zoneSchema.safeParse({ ...zone, top: { value: -40, unit: 'ft' } }).success).toBe(false)
    expect(zoneSchema.safeParse({ ...zone, top: { value: -30, unit: 'ft' } }).success).toBe(true)
  })

  it('that lies everywhere below others is said to replace them', () => {
    const outlined = zoneSchema.parse({ ...zone, name: 'Bank', polygon: square })
    const remarks = zoneRemarks(asRows([outlined, zoneSchema.parse(zone)]))
    expect(remarks['1']?.[0]?.message).toContain('replaces all zones above')
  })

  it('with an outline only is said to leave the rest of the site without ground', () => {
    const remarks = zoneRemarks(asRows([zoneSchema.parse({ ...zone, polygon: square })]))
    expect(remarks['0']?.[0]?.field).toBe('polygon')
  })
})
