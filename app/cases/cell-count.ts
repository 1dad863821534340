import type { Model } from '~/solver/model'

/** Cells of a model file's grid; for a planned grid at least so many: planning it, with the solve, tells the rest. */
export function cellCount({ grid, extent }: Pick<Model, 'grid' | 'extent'>): number {
  if ('columns' in grid) return grid.columns * grid.rows
  if ('xEdges' in grid) return (grid.xEdges.length - 1) * (grid.yEdges.length - 1)
  const count = ([low, high]: [number, number]) => Math.max(1, Math.ceil((high - low) / grid.cellSize))
  return count(extent.x) * count(extent.y)
}
