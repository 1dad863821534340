import { largestCellCount } from './grid'
import type { Model } from './model'

/** The same model on a grid whose cells are `times` as long and wide: 2 is coarser, 0.5 finer, and so on. */
export function onGrid(model: Model, times: number): Model {
  const { grid } = model
  if ('xEdges' in grid) {
    return { ...model, grid: { xEdges: edgesOf(grid.xEdges, times), yEdges: edgesOf(grid.yEdges, times) } }
  }
  if ('cellSize' in grid) {
    const refine = grid.refine?.map((place) => ({ ...place, cellSize: place.cellSize * times }))
    return { ...model, grid: { cellSize: grid.cellSize * times, ...(refine ? { refine } : {}) } }
  }
  const count = (cells: number) => Math.max(1, Math.round(cells / times))
  return { ...model, grid: { columns: count(grid.columns), rows: count(grid.rows) } }
}

/** Given edges: cells halved as often as needed, or neighbours joined, a last one left over by itself. */
function edgesOf(edges: number[], times: number): number[] {
  if (times < 1) {
    const parts = Math.round(1 / times)
    const finer = edges.slice(0, -1).flatMap((low, k) => {
      const high = edges[k + 1] as number
      return Array.from({ length: parts }, (_, part) => low + ((high - low) * part) / parts)
    })
    return [...finer, edges[edges.length - 1] as number]
  }
  const joined = Math.round(times)
  return edges.filter((_, k) => k % joined === 0 || k === edges.length - 1)
}

/** Grids to compare with the model's own, as multiples of its cell size, and why those. */
export interface GridChoice {
  times: number[]
  why: string
}

/**
 * The model's grid, one coarser and one finer by a factor of 2; where the finer one would be too large, two coarser
 * ones; where a coarser one would have too few cells, two finer ones.
 */
export function gridChoice(cells: number, columns: number, rows: number, mostCells: number): GridChoice {
  const most = Math.min(mostCells, largestCellCount)
  const finer = 4 * cells <= most
  const shorter = Math.min(columns > 1 ? columns : rows, rows > 1 ? rows : columns)
  const coarser = shorter >= 8
  if (finer && coarser) {
    return { times: [0.5, 1, 2], why: 'the grid itself, one of half and one of twice its cell size' }
  }
  if (!finer) {
    if (!coarser)
      return { times: [1], why: `a finer grid would have more than ${most} cells, a coarser one too few` }
    const two = shorter >= 16
    return {
      times: two ? [1, 2, 4] : [1, 2],
      why: `a finer grid would have more than ${most} cells: the grid itself and coarser ones`,
    }
  }
  return 16 * cells <= most
    ? {
        times: [0.25, 0.5, 1],
        why: 'a coarser grid would have too few cells: the grid itself and two finer ones',
      }
    : {
        times: [0.5, 1],
        why: `a coarser grid would have too few cells, a second finer one more than ${most}`,
      }
}
