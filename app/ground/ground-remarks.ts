import type { Row } from '~/book/row'
import { convert, formatNumber, formatQuantity, type Quantity, type UnitName } from '~/units'
import type { Material, Point, Zone } from './ground'

/** A remark about a cell that refuses nothing. */
export interface Remark {
  field: string
  message: string
}

export type Remarks = Record<string, Remark[]>

// Spans of values met in soils and rocks: common practice, no single source. Outside them a slip of the unit is
// more likely than such a ground.
const conductivitySpan = { low: 1e-12, high: 1, unit: 'm/s' } as const
const storageSpan = { low: 1e-7, high: 1e-2, unit: '1/m' } as const
const yieldSpan = { low: 0.005, high: 0.45 }
const porositySpan = { low: 0.01, high: 0.7 }
const greatestAnisotropy = 100

export function addRemark(remarks: Remarks, id: string, field: string, message: string): void {
  remarks[id] = [...(remarks[id] ?? []), { field, message }]
}

/** Says of each row whose name another row of the same sheet has as well. */
export function remarkRepeatedNames(
  remarks: Remarks,
  rows: readonly { id: string; body: { name: string } }[],
  field = 'name',
): void {
  const counts = new Map<string, number>()
  const plain = (name: string) => name.trim().toLowerCase()
  for (const { body } of rows) counts.set(plain(body.name), (counts.get(plain(body.name)) ?? 0) + 1)
  for (const { id, body } of rows) {
    if ((counts.get(plain(body.name)) ?? 0) > 1) {
      addRemark(remarks, id, field, 'Another row has this name too: results could not be told apart.')
    }
  }
}

function outside(quantity: Quantity, span: { low: number; high: number; unit: UnitName }): string | null {
  const value = convert(quantity, span.unit)
  if (value >= span.low && value <= span.high) return null
  return `${formatQuantity(quantity, span.unit)} is outside the usual ${formatNumber(span.low)} to ${formatNumber(span.high)} ${span.unit}: is the unit right?`
}

/** Materials whose values lie outside what is usual. */
export function materialRemarks(materials: readonly Row<Material>[]): Remarks {
  const remarks: Remarks = {}
  remarkRepeatedNames(remarks, materials)
  for (const { id, body } of materials) {
    for (const field of ['kx', 'ky', 'kLow', 'kHigh'] as const) {
      const quantity = body[field]
      const message = quantity && outside(quantity, conductivitySpan)
      if (message) addRemark(remarks, id, field, message)
    }
    const ratio = convert(body.kx, 'm/s') / convert(body.ky, 'm/s')
    if (ratio > greatestAnisotropy || ratio < 1 / greatestAnisotropy) {
      addRemark(remarks, id, 'ky', `K along x is ${formatNumber(ratio)} times K along y: unusual in plan.`)
    }
    const storage = body.specificStorage && outside(body.specificStorage, storageSpan)
    if (storage) addRemark(remarks, id, 'specificStorage', storage)
    const { specificYield, porosity } = body
    if (specificYield !== null && (specificYield < yieldSpan.low || specificYield > yieldSpan.high)) {
      addRemark(
        remarks,
        id,
        'specificYield',
        `Usual values lie between ${yieldSpan.low} and ${yieldSpan.high}.`,
      )
    }
    if (porosity !== null && (porosity < porositySpan.low || porosity > porositySpan.high)) {
      addRemark(
        remarks,
        id,
        'porosity',
        `Usual values lie between ${porositySpan.low} and ${porositySpan.high}.`,
      )
    }
    if (specificYield !== null && porosity !== null && specificYield > porosity) {
      addRemark(remarks, id, 'specificYield', 'Specific yield is larger than the porosity.')
    }
  }
  return remarks
}

export function zoneRemarks(zones: readonly Row<Zone>[]): Remarks {
  const remarks: Remarks = {}
  remarkRepeatedNames(remarks, zones)
  const [first] = zones
  if (first && !zones.some((zone) => zone.body.polygon === null)) {
    addRemark(
      remarks,
      first.id,
      'polygon',
      'No zone lies everywhere: cells outside every polygon have no ground and take no part.',
    )
  }
  zones.forEach(({ id, body }, index) => {
    if (body.polygon === null && index > 0) {
      addRemark(
        remarks,
        id,
        'polygon',
        'This zone lies everywhere and replaces all zones above it in the sheet.',
      )
    }
  })
  return remarks
}

export function pointRemarks(points: readonly Row<Point>[]): Remarks {
  const remarks: Remarks = {}
  remarkRepeatedNames(remarks, points)
  return remarks
}
