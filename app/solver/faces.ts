import type { Grid } from './grid'

/**
 * Cell faces have one number each: first the faces between columns, `j * (columns + 1) + i` with i = 0 on the west
 * edge, then the faces between rows, `count + j * columns + i` with j = 0 on the south edge. The "low" cell of a face
 * is the one to its west or south, the "high" cell the one to its east or north; -1 outside the extent.
 */
export function columnFaceCount(grid: Grid): number {
  return (grid.columns + 1) * grid.rows
}

/** How many faces a grid has, those on its edge included. */
export function faceCount(grid: Grid): number {
  return columnFaceCount(grid) + grid.columns * (grid.rows + 1)
}

/** Index of the face on the low-x side of cell (i, j); i = columns gives the edge of high x. */
export function faceBetweenColumns(grid: Grid, i: number, j: number): number {
  return j * (grid.columns + 1) + i
}

/** Index of the face on the low-y side of cell (i, j), behind all faces between columns; j = rows gives the edge of high y. */
export function faceBetweenRows(grid: Grid, i: number, j: number): number {
  return columnFaceCount(grid) + j * grid.columns + i
}

export interface Face {
  /** 'x' when water crosses it along x (a face between columns). */
  axis: 'x' | 'y'
  low: number
  high: number
  length: number
  middle: [x: number, y: number]
  /** From the low and the high cell's centre to the face; 0 where there is no such cell. */
  lowHalf: number
  highHalf: number
}

/** Everything about one face. For the few faces that lines touch; loops over the grid work with plain indices. */
export function faceOf(grid: Grid, face: number): Face {
  const { columns, rows, xEdges, yEdges } = grid
  const split = columnFaceCount(grid)
  if (face < split) {
    const j = Math.floor(face / (columns + 1))
    const i = face - j * (columns + 1)
    const south = yEdges[j] as number
    const north = yEdges[j + 1] as number
    const x = xEdges[i] as number
    return {
      axis: 'x',
      low: i > 0 ? j * columns + i - 1 : -1,
      high: i < columns ? j * columns + i : -1,
      length: north - south,
      middle: [x, (south + north) / 2],
      lowHalf: i > 0 ? (x - (xEdges[i - 1] as number)) / 2 : 0,
      highHalf: i < columns ? ((xEdges[i + 1] as number) - x) / 2 : 0,
    }
  }
  const j = Math.floor((face - split) / columns)
  const i = face - split - j * columns
  const west = xEdges[i] as number
  const east = xEdges[i + 1] as number
  const y = yEdges[j] as number
  return {
    axis: 'y',
    low: j > 0 ? (j - 1) * columns + i : -1,
    high: j < rows ? j * columns + i : -1,
    length: east - west,
    middle: [(west + east) / 2, y],
    lowHalf: j > 0 ? (y - (yEdges[j - 1] as number)) / 2 : 0,
    highHalf: j < rows ? ((yEdges[j + 1] as number) - y) / 2 : 0,
  }
}

/** The four faces of a cell: west, east, south, north. */
export function facesOfCell(grid: Grid, cell: number): [number, number, number, number] {
  const j = Math.floor(cell / grid.columns)
  const i = cell - j * grid.columns
  return [
    faceBetweenColumns(grid, i, j),
    faceBetweenColumns(grid, i + 1, j),
    faceBetweenRows(grid, i, j),
    faceBetweenRows(grid, i, j + 1),
  ]
}
