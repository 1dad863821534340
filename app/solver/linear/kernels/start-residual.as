import { R, rowAt } from './layout'
import { otherRows, sameRow } from './links'

// Residual of the even rows from..to - 1 after the sweep from x = 0: what relaxing the later colours has added,
//   even columns  r = sum over all links a x,   odd columns  r = sum over the other rows' links a x
// No difference of nearly equal numbers is formed.
export function startResidual(level: usize, size: usize, stride: usize, half: usize, from: i32, to: i32): void {
  for (let j = from; j < to; j += 2) {
    const row = rowAt(level, stride, j)
    for (let c = row; c < row + half - 16; c += 16) {
      v128.store(
        c + R * size,
        f32x4.add(sameRow(c, size, half - 4), otherRows(c, size, stride, half - 4)),
      )
    }
    for (let c = row + half; c < row + 2 * half - 16; c += 16) {
      v128.store(c + R * size, otherRows(c, size, stride, 0 - half))
    }
  }
}
