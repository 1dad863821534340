import { convert, type ProjectUnits, type Quantity } from '~/units'
import type { Extent } from './case'

/** A uniform grid over the extent; `width` and `height` are those of one cell, in the project's length unit. */
export interface GridSize {
  columns: number
  rows: number
  cells: number
  width: number
  height: number
}

/**
 * The uniform grid nearest to the cell size asked for: the cells fill the extent exactly, so that their size differs
 * from the one asked for where the extent is no whole multiple of it.
 */
export function gridSize(extent: Extent, cellSize: Quantity, units: ProjectUnits): GridSize {
  const size = convert(cellSize, units.length)
  const count = (length: number) => Math.max(1, Math.round(length / size))
  const columns = count(extent.xMax - extent.xMin)
  const rows = count(extent.yMax - extent.yMin)
  return {
    columns,
    rows,
    cells: columns * rows,
    width: (extent.xMax - extent.xMin) / columns,
    height: (extent.yMax - extent.yMin) / rows,
  }
}
