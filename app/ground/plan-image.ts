import type { Vertex } from '~/book/field'
import type { PlanImage } from './ground'

/**
 * Where the pixels of a plan image lie: x = xColumn * column + xRow * row + xOrigin, and y likewise. Column and row
 * count from the picture's top left corner, rows downwards. `pixelSize` is the side of a pixel in the coordinates' unit,
 * `turn` the direction of the picture's rows in radians, anticlockwise from x.
 */
export interface PlanImagePlacement {
  xColumn: number
  xRow: number
  xOrigin: number
  yColumn: number
  yRow: number
  yOrigin: number
  pixelSize: number
  turn: number
}

/**
 * The similarity (scale, turn, shift) that puts two known points of a picture on their coordinates. With the picture as
 * complex numbers w = column - i row and the ground as z = x + i y it is z = m w + t: m = (z2 - z1) / (w2 - w1).
 * Throws where the two points are one pixel.
 */
export function planImagePlacement([first, second]: PlanImage['control']): PlanImagePlacement {
  const [dColumn, dRow] = [second.column - first.column, second.row - first.row]
  const [dx, dy] = [second.x - first.x, second.y - first.y]
  const square = dColumn ** 2 + dRow ** 2
  if (square === 0) throw new Error('The two known points are the same pixel.')
  const real = (dx * dColumn - dy * dRow) / square
  const imaginary = (dx * dRow + dy * dColumn) / square
  return {
    xColumn: real,
    xRow: imaginary,
    xOrigin: first.x - real * first.column - imaginary * first.row,
    yColumn: imaginary,
    yRow: -real,
    yOrigin: first.y - imaginary * first.column + real * first.row,
    pixelSize: Math.hypot(real, imaginary),
    turn: Math.atan2(imaginary, real),
  }
}

/** Coordinates of a pixel. */
export function placedPixel(placement: PlanImagePlacement, column: number, row: number): Vertex {
  return [
    placement.xColumn * column + placement.xRow * row + placement.xOrigin,
    placement.yColumn * column + placement.yRow * row + placement.yOrigin,
  ]
}

/** The picture's corners on the ground: top left, top right, bottom right, bottom left. */
export function planImageCorners(
  placement: PlanImagePlacement,
  width: number,
  height: number,
): [Vertex, Vertex, Vertex, Vertex] {
  return [
    placedPixel(placement, 0, 0),
    placedPixel(placement, width, 0),
    placedPixel(placement, width, height),
    placedPixel(placement, 0, height),
  ]
}
