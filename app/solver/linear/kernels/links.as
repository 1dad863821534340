import { EAST, NORTH, NORTH_EAST, NORTH_WEST, X } from './layout'

// Sums over the links of four neighbouring cells of one half row, at address c of a level's first array. `w` leads from
// a cell to its western neighbour in the other half: half - 4 for even columns, -half for odd ones.

// @ts-ignore: decorator
@inline
function term(link: usize, x: usize): v128 {
  return f32x4.mul(v128.load(link), v128.load(x))
}

// Sum of a x over the neighbours in the same row.
// @ts-ignore: decorator
@inline
export function sameRow(c: usize, size: usize, w: usize): v128 {
  const x = c + X * size
  const east = c + EAST * size
  return f32x4.add(term(east + w, x + w), term(east, x + w + 4))
}

// Sum of a x over the six neighbours in the rows below and above.
// @ts-ignore: decorator
@inline
export function otherRows(c: usize, size: usize, stride: usize, w: usize): v128 {
  const x = c + X * size
  const north = c + NORTH * size
  const northEast = c + NORTH_EAST * size
  const northWest = c + NORTH_WEST * size
  const above = f32x4.add(
    f32x4.add(term(north, x + stride), term(northEast, x + stride + w + 4)),
    term(northWest, x + stride + w),
  )
  const below = f32x4.add(
    f32x4.add(term(north - stride, x - stride), term(northEast - stride + w, x - stride + w)),
    term(northWest - stride + w + 4, x - stride + w + 4),
  )
  return f32x4.add(above, below)
}

// @ts-ignore: decorator
@inline
function flow(link: usize, x: usize, here: v128): v128 {
  return f32x4.mul(v128.load(link), f32x4.sub(v128.load(x), here))
}

// Sum of a (x_neighbour - x) over all eight neighbours.
// @ts-ignore: decorator
@inline
export function flows(c: usize, size: usize, stride: usize, w: usize): v128 {
  const x = c + X * size
  const here = v128.load(x)
  const east = c + EAST * size
  const north = c + NORTH * size
  const northEast = c + NORTH_EAST * size
  const northWest = c + NORTH_WEST * size
  const row = f32x4.add(flow(east + w, x + w, here), flow(east, x + w + 4, here))
  const above = f32x4.add(
    f32x4.add(flow(north, x + stride, here), flow(northEast, x + stride + w + 4, here)),
    flow(northWest, x + stride + w, here),
  )
  const below = f32x4.add(
    f32x4.add(flow(north - stride, x - stride, here), flow(northEast - stride + w, x - stride + w, here)),
    flow(northWest - stride + w + 4, x - stride + w + 4, here),
  )
  return f32x4.add(row, f32x4.add(above, below))
}
