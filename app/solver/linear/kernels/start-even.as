import { B, INVERSE, X, rowAt } from './layout'
import { sameRow } from './links'

// First half of a four-colour Gauss-Seidel sweep from x = 0 on a nine-point level: even rows from..to - 1.
//   even columns  x = b / D,   then odd columns  x = (b + sum over the row's links a x) / D
export function startEven(level: usize, size: usize, stride: usize, half: usize, from: i32, to: i32): void {
  for (let j = from; j < to; j += 2) {
    const row = rowAt(level, stride, j)
    for (let c = row; c < row + half - 16; c += 16) {
      v128.store(c + X * size, f32x4.mul(v128.load(c + INVERSE * size), v128.load(c + B * size)))
    }
    for (let c = row + half; c < row + 2 * half - 16; c += 16) {
      const sum = f32x4.add(v128.load(c + B * size), sameRow(c, size, 0 - half))
      v128.store(c + X * size, f32x4.mul(v128.load(c + INVERSE * size), sum))
    }
  }
}
