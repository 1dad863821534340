import { EAST, INVERSE, NORTH, NORTH_EAST, NORTH_WEST, OWN, rowAt } from './layout'

// @ts-ignore: decorator
@inline
function invertHalf(first: usize, size: usize, stride: usize, half: usize, w: usize): void {
  const zero = f32x4.splat(0)
  const one = f32x4.splat(1)
  for (let c = first; c < first + half - 16; c += 16) {
    const north = c + NORTH * size
    const northEast = c + NORTH_EAST * size
    const northWest = c + NORTH_WEST * size
    const row = f32x4.add(v128.load(c + EAST * size), v128.load(c + EAST * size + w))
    const above = f32x4.add(f32x4.add(v128.load(north), v128.load(northEast)), v128.load(northWest))
    const below = f32x4.add(
      f32x4.add(v128.load(north - stride), v128.load(northEast - stride + w)),
      v128.load(northWest - stride + w + 4),
    )
    const links = f32x4.add(row, f32x4.add(above, below))
    const diagonal = f32x4.add(v128.load(c + OWN * size), links)
    const inverse = v128.and(f32x4.div(one, diagonal), f32x4.gt(diagonal, zero))
    v128.store(c + INVERSE * size, inverse)
  }
}

// 1 / diagonal of rows from..to - 1 of a nine-point level, diagonal = own + sum of links; 0 where there is no equation.
export function invert(level: usize, size: usize, stride: usize, half: usize, from: i32, to: i32): void {
  for (let j = from; j < to; j++) {
    const row = rowAt(level, stride, j)
    invertHalf(row, size, stride, half, half - 4)
    invertHalf(row + half, size, stride, half, 0 - half)
  }
}
