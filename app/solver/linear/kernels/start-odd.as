import { B, INVERSE, R, X, rowAt } from './layout'
import { otherRows, sameRow } from './links'

// Second half of the sweep from x = 0: odd rows from..to - 1, even columns before odd ones, each x = (b + sum a x) / D.
// What relaxing the odd columns leaves of the even columns' equations is their residual, sum over the row's links a x;
// that of the odd columns is 0 and is not stored.
export function startOdd(level: usize, size: usize, stride: usize, half: usize, from: i32, to: i32): void {
  for (let j = from; j < to; j += 2) {
    const row = rowAt(level, stride, j)
    for (let c = row; c < row + half - 16; c += 16) {
      const sum = f32x4.add(v128.load(c + B * size), otherRows(c, size, stride, half - 4))
      v128.store(c + X * size, f32x4.mul(v128.load(c + INVERSE * size), sum))
    }
    for (let c = row + half; c < row + 2 * half - 16; c += 16) {
      const around = f32x4.add(sameRow(c, size, 0 - half), otherRows(c, size, stride, 0 - half))
      const sum = f32x4.add(v128.load(c + B * size), around)
      v128.store(c + X * size, f32x4.mul(v128.load(c + INVERSE * size), sum))
    }
    for (let c = row; c < row + half - 16; c += 16) v128.store(c + R * size, sameRow(c, size, half - 4))
  }
}
