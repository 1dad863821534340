import { lineLength, signedArea } from '~/book/field'
import type { Row } from '~/book/row'
import { convert, type ProjectUnits, shownUnit, type UnitName } from '~/units'
import type { Boundary, RechargeZone, Wall, Well } from './water'

export interface RechargeVolume {
  id: string
  name: string
  /** Area in the square of the project's length unit; null where the zone lies everywhere. */
  area: number | null
  /** Area times rate, in the project's unit of rate; null where the area is that of the grid of a case. */
  volume: number | null
}

export interface WaterTotals {
  unit: UnitName
  /** Sum of the rates of abstraction wells, and of recharge wells, in `unit`. */
  abstraction: number
  abstractionWells: number
  recharge: number
  rechargeWells: number
  volumes: RechargeVolume[]
  /** Specified fluxes times their line lengths, positive into the model, in `unit`. */
  specifiedFlux: number
  /** Total length of walls, in the project's length unit. */
  wallLength: number
}

/** What section 3 puts into the ground and takes out of it, as entered: the base case, before any run. */
export function waterTotals(
  rows: {
    wells: Row<Well>[]
    rechargeZones: Row<RechargeZone>[]
    boundaries: Row<Boundary>[]
    walls: Row<Wall>[]
  },
  units: ProjectUnits,
): WaterTotals {
  const unit = shownUnit('rate', units)
  const speed = shownUnit('conductivity', units)
  const ofKind = (kind: Well['kind']) => rows.wells.filter((well) => well.body.kind === kind)
  const sum = (wells: Row<Well>[]) => wells.reduce((total, well) => total + convert(well.body.rate, unit), 0)
  const specifiedFlux = rows.boundaries.reduce((total, { body }) => {
    if (body.kind !== 'specified flux' || !body.flux) return total
    const flow = convert(body.flux, shownUnit('line flux', units)) * lineLength(body.line)
    return total + (body.direction === 'into the model' ? flow : -flow)
  }, 0)
  return {
    unit,
    abstraction: sum(ofKind('abstraction')),
    abstractionWells: ofKind('abstraction').length,
    recharge: sum(ofKind('recharge')),
    rechargeWells: ofKind('recharge').length,
    volumes: rows.rechargeZones.map(({ id, body }) => {
      const area = body.polygon ? Math.abs(signedArea(body.polygon)) : null
      const volume = area === null ? null : area * convert(body.rate, speed)
      return { id, name: body.name, area, volume }
    }),
    specifiedFlux,
    wallLength: rows.walls.reduce((total, wall) => total + lineLength(wall.body.line), 0),
  }
}
