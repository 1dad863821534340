import { B, OWN, R, X, rowAt } from './layout'
import { flows } from './links'

// @ts-ignore: decorator
@inline
function residualHalf(first: usize, size: usize, stride: usize, half: usize, w: usize): void {
  for (let c = first; c < first + half - 16; c += 16) {
    const held = f32x4.mul(v128.load(c + OWN * size), v128.load(c + X * size))
    const sum = f32x4.add(f32x4.sub(v128.load(c + B * size), held), flows(c, size, stride, w))
    v128.store(c + R * size, sum)
  }
}

// Residual after a forward sweep from any x, in difference form, rows from..to - 1:
//   r = b - own x + sum a (x_neighbour - x)
// The colour relaxed last, odd columns of odd rows, has none and is not stored.
export function residual(level: usize, size: usize, stride: usize, half: usize, from: i32, to: i32): void {
  for (let j = from; j < to; j++) {
    const row = rowAt(level, stride, j)
    residualHalf(row, size, stride, half, half - 4)
    if ((j & 1) === 0) residualHalf(row + half, size, stride, half, 0 - half)
  }
}
