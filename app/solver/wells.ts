import { facesOfCell } from './faces'
import { cellAt, type Grid } from './grid'
import type { Model, Value } from './model'
import { ModelError, requireFinite, requireNotNegative, requirePositive } from './model-error'
import { type Share, sharesAt } from './placing'
import type { Warning } from './result'

/** A well on the grid. `requested` is the flow into the ground: negative for abstraction. */
export interface PlacedWell {
  name: string
  x: number
  y: number
  requested: number
  /** 0 when not given. */
  radius: number
  /** Minus infinity when not given. */
  lowestLevel: number
  shares: Share[]
}

/** Places the wells at their true positions. Refuses wells outside the extent or the ground, or on a wall. */
export function placeWells(
  model: Model,
  grid: Grid,
  active: Uint8Array,
  wallShare: Float64Array,
  warnings: Warning[],
): PlacedWell[] {
  return (model.wells ?? []).map((well, index) => {
    const path = `wells[${index}]`
    const x = requireFinite(well.x, `${path}.x`)
    const y = requireFinite(well.y, `${path}.y`)
    if (cellAt(grid, x, y) < 0) {
      throw new ModelError(`${path}.x`, `the well "${well.name}" at (${x}, ${y}) lies outside the extent`)
    }
    const rate = requireNotNegative(singleRate(well.rate, `${path}.rate`), `${path}.rate`)
    if (well.kind !== 'abstraction' && well.kind !== 'recharge') {
      throw new ModelError(`${path}.kind`, 'must be "abstraction" or "recharge"')
    }
    const placed = sharesAt(model, grid, active, x, y)
    if (placed === 'on a wall') throw new ModelError(path, `the well "${well.name}" stands on a wall`)
    if (placed === 'hidden') {
      throw new ModelError(
        path,
        `the well "${well.name}" at (${x}, ${y}) has no cell centre on its side of the walls: it needs smaller cells`,
      )
    }
    if (placed === 'outside') {
      throw new ModelError(path, `the well "${well.name}" at (${x}, ${y}) stands where there is no ground`)
    }
    const besideWall = placed.shares.some((share) =>
      facesOfCell(grid, share.cell).some((face) => (wallShare[face] as number) > 0),
    )
    if (besideWall) {
      warnings.push({
        code: 'well-near-wall',
        severity: 'check',
        text: `The well "${well.name}" stands within a cell of a wall: heads between them are coarse, and the head at the well face does not know the wall.`,
      })
    }
    return {
      name: well.name,
      x,
      y,
      requested: well.kind === 'abstraction' ? -rate : rate,
      radius: well.radius === undefined ? 0 : requirePositive(well.radius, `${path}.radius`),
      lowestLevel:
        well.lowestLevel === undefined
          ? Number.NEGATIVE_INFINITY
          : requireFinite(well.lowestLevel, `${path}.lowestLevel`),
      shares: placed.shares,
    }
  })
}

function singleRate(value: Value, path: string): number {
  if (typeof value === 'number') return requireFinite(value, path)
  throw new ModelError(path, 'must be one number')
}

/**
 * ln of the equivalent radius of a well shared among cells: the distance at which the head of radial flow equals the
 * weighted mean of the cells' heads. One cell: Peaceman (1983, equation 17), which for square cells is 0.1985 dx on an
 * endless grid. Several: raised by 2 pi sqrt(Tx Ty) times the sum of w_i w_j R_ij / 2, R_ij being the resistance
 * between two nodes of the endless grid (adjacent and diagonal neighbours: van der Pol & Bremmer 1955; Cserti 2000);
 * four equal shares of square cells give 0.7178 dx.
 *
 * `dx`, `dy` are the cell's size, or the distances between the centres sharing; `anisotropy` is Tx / Ty.
 */
export function logEquivalentRadius(
  shares: { column: number; row: number; weight: number }[],
  dx: number,
  dy: number,
  anisotropy: number,
): number {
  const root = Math.sqrt(anisotropy)
  // e^-gamma / 4 is Peaceman's 0.14; written so, square cells give exactly 0.1985.
  const single =
    (Math.exp(-0.5772156649015329) / 2) *
    (Math.sqrt((dx * dx) / root + dy * dy * root) / (Math.sqrt(root) + 1 / Math.sqrt(root)))
  // Conductances of the two kinds of link for sqrt(Tx Ty) = 1.
  const cx = (root * dy) / dx
  const cy = dx / dy / root
  const resistance = [
    [0, (2 / (Math.PI * cy)) * Math.atan(Math.sqrt(cy / cx))],
    [(2 / (Math.PI * cx)) * Math.atan(Math.sqrt(cx / cy)), 2 / (Math.PI * Math.sqrt(cx * cy))],
  ]
  let raised = 0
  for (const a of shares) {
    for (const b of shares) {
      const row = resistance[Math.abs(a.column - b.column)] as number[]
      raised += a.weight * b.weight * 0.5 * (row[Math.abs(a.row - b.row)] as number)
    }
  }
  return Math.log(single) + 2 * Math.PI * raised
}
