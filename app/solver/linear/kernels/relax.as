import { B, INVERSE, X, rowAt } from './layout'
import { otherRows, sameRow } from './links'

// @ts-ignore: decorator
@inline
function relaxHalf(first: usize, size: usize, stride: usize, half: usize, w: usize): void {
  for (let c = first; c < first + half - 16; c += 16) {
    const around = f32x4.add(sameRow(c, size, w), otherRows(c, size, stride, w))
    const sum = f32x4.add(v128.load(c + B * size), around)
    v128.store(c + X * size, f32x4.mul(v128.load(c + INVERSE * size), sum))
  }
}

// Gauss-Seidel x = (b + sum a x) / D on every second row of a nine-point level, from..to - 1: even columns then odd ones,
// or, backwards, odd ones then even ones.
export function relax(
  level: usize,
  size: usize,
  stride: usize,
  half: usize,
  from: i32,
  to: i32,
  backwards: i32,
): void {
  for (let j = from; j < to; j += 2) {
    const row = rowAt(level, stride, j)
    if (!backwards) relaxHalf(row, size, stride, half, half - 4)
    relaxHalf(row + half, size, stride, half, 0 - half)
    if (backwards) relaxHalf(row, size, stride, half, half - 4)
  }
}
