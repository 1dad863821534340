import { X, rowAt } from './layout'
import { joinRow } from './order'

// x += P x_coarse for the fine rows of coarse rows from..to - 1, every second row and column left out on the coarse level.
// Odd columns of odd rows are relaxed first afterwards, whatever they hold, and left alone. `natural`: memory for two
// coarse rows, `half` + 16 bytes apart.
export function correctBoth(
  level: usize,
  size: usize,
  stride: usize,
  half: usize,
  shares: usize,
  sharesSize: usize,
  coarse: usize,
  coarseSize: usize,
  coarseStride: usize,
  coarseHalf: usize,
  natural: usize,
  apart: usize,
  from: i32,
  to: i32,
): void {
  joinRow(rowAt(coarse, coarseStride, from) + X * coarseSize, natural + <usize>(from & 1) * apart, coarseHalf)
  for (let J = from; J < to; J++) {
    const here = natural + <usize>(J & 1) * apart
    const next = natural + <usize>((J + 1) & 1) * apart
    joinRow(rowAt(coarse, coarseStride, J + 1) + X * coarseSize, next, coarseHalf)
    const row = rowAt(level, stride, 2 * J) + X * size
    const share = rowAt(shares, half, J)
    for (let o: usize = 0; o < half - 16; o += 16) {
      const c = row + o
      const s = share + o
      const e = v128.load(here + o)
      v128.store(c, f32x4.add(v128.load(c), e))
      const odd = f32x4.add(
        f32x4.mul(v128.load(s), e),
        f32x4.mul(v128.load(s + sharesSize), v128.load(here + o + 4)),
      )
      v128.store(c + half, f32x4.add(v128.load(c + half), odd))
      const above = f32x4.add(
        f32x4.mul(v128.load(s + 2 * sharesSize), e),
        f32x4.mul(v128.load(s + 3 * sharesSize), v128.load(next + o)),
      )
      v128.store(c + stride, f32x4.add(v128.load(c + stride), above))
    }
  }
}

// The same for rows from..to - 1 when only every second column is left out.
export function correctAlong(
  level: usize,
  size: usize,
  stride: usize,
  half: usize,
  shares: usize,
  sharesSize: usize,
  coarse: usize,
  coarseSize: usize,
  coarseStride: usize,
  coarseHalf: usize,
  natural: usize,
  from: i32,
  to: i32,
): void {
  for (let j = from; j < to; j++) {
    joinRow(rowAt(coarse, coarseStride, j) + X * coarseSize, natural, coarseHalf)
    const row = rowAt(level, stride, j) + X * size
    const share = rowAt(shares, half, j)
    for (let o: usize = 0; o < half - 16; o += 16) {
      const c = row + o
      const s = share + o
      const e = v128.load(natural + o)
      v128.store(c, f32x4.add(v128.load(c), e))
      const odd = f32x4.add(
        f32x4.mul(v128.load(s), e),
        f32x4.mul(v128.load(s + sharesSize), v128.load(natural + o + 4)),
      )
      v128.store(c + half, f32x4.add(v128.load(c + half), odd))
    }
  }
}
