import { B, R, rowAt } from './layout'
import { splitRow } from './order'

// Coarse right-hand side of rows from..to - 1 when every second row and column is left out: b_C = sum of P_cC r_c, with
// the shares P of the cell's column neighbours (`shares`: arrays west, east of even rows, south, north of odd ones, each
// `sharesSize` bytes, a row `half` bytes). Odd columns of odd rows have no residual. `natural`: memory for a coarse row.
export function restrictBoth(
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
  for (let J = from; J < to; J++) {
    const row = rowAt(level, stride, 2 * J) + R * size
    const share = rowAt(shares, half, J)
    for (let o: usize = 0; o < half - 16; o += 16) {
      const c = row + o
      const s = share + o
      const west = f32x4.mul(v128.load(s + sharesSize - 4), v128.load(c + half - 4))
      const east = f32x4.mul(v128.load(s), v128.load(c + half))
      const north = f32x4.mul(v128.load(s + 2 * sharesSize), v128.load(c + stride))
      const south = f32x4.mul(v128.load(s + 3 * sharesSize - half), v128.load(c - stride))
      const around = f32x4.add(f32x4.add(west, east), f32x4.add(south, north))
      v128.store(natural + o, f32x4.add(v128.load(c), around))
    }
    splitRow(natural, rowAt(coarse, coarseStride, J) + B * coarseSize, coarseHalf)
  }
}

// The same when only every second column is left out: shares west, east of every row.
export function restrictAlong(
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
    const row = rowAt(level, stride, j) + R * size
    const share = rowAt(shares, half, j)
    for (let o: usize = 0; o < half - 16; o += 16) {
      const c = row + o
      const s = share + o
      const west = f32x4.mul(v128.load(s + sharesSize - 4), v128.load(c + half - 4))
      const east = f32x4.mul(v128.load(s), v128.load(c + half))
      v128.store(natural + o, f32x4.add(v128.load(c), f32x4.add(west, east)))
    }
    splitRow(natural, rowAt(coarse, coarseStride, j) + B * coarseSize, coarseHalf)
  }
}
