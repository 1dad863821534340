import { REST, SCALED, Z, singleRow } from './colours'
import { B, X, rowAt } from './layout'
import { joinRow, splitRow } from './order'

// Between the five-point level and the next. Only red cells have a residual and only red values are corrected: black
// ones follow from them.

// Every second row and column left out: red cells of even rows are the coarse cells; those of odd rows lie in the
// middle of four, with shares south-west, south-east, north-west, north-east (row J of each array: fine row 2 J + 1).
export function restrictRedBoth(
  single: usize,
  size: usize,
  stride: usize,
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
    const row = singleRow(single, stride, 2 * J) + REST * size
    const share = rowAt(shares, stride, J)
    for (let o: usize = 0; o < stride - 16; o += 16) {
      const c = row + o
      const s = share + o
      const northEast = f32x4.mul(v128.load(s), v128.load(c + stride))
      const northWest = f32x4.mul(v128.load(s + sharesSize - 4), v128.load(c + stride - 4))
      const southEast = f32x4.mul(v128.load(s + 2 * sharesSize - stride), v128.load(c - stride))
      const southWest = f32x4.mul(v128.load(s + 3 * sharesSize - stride - 4), v128.load(c - stride - 4))
      const around = f32x4.add(f32x4.add(northEast, northWest), f32x4.add(southEast, southWest))
      v128.store(natural + o, f32x4.add(v128.load(c), around))
    }
    splitRow(natural, rowAt(coarse, coarseStride, J) + B * coarseSize, coarseHalf)
  }
}

// z = r / D + P x_coarse, for the fine rows of coarse rows from..to - 1.
export function correctRedBoth(
  single: usize,
  size: usize,
  stride: usize,
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
    const row = singleRow(single, stride, 2 * J)
    const share = rowAt(shares, stride, J)
    for (let o: usize = 0; o < stride - 16; o += 16) {
      const c = row + o
      const s = share + o
      const e = v128.load(here + o)
      v128.store(c + Z * size, f32x4.add(v128.load(c + SCALED * size), e))
      const below = f32x4.add(
        f32x4.mul(v128.load(s), e),
        f32x4.mul(v128.load(s + sharesSize), v128.load(here + o + 4)),
      )
      const above = f32x4.add(
        f32x4.mul(v128.load(s + 2 * sharesSize), v128.load(next + o)),
        f32x4.mul(v128.load(s + 3 * sharesSize), v128.load(next + o + 4)),
      )
      const up = c + stride
      v128.store(up + Z * size, f32x4.add(v128.load(up + SCALED * size), f32x4.add(below, above)))
    }
  }
}

// Only every second column left out: in even rows red cells are the coarse cells, in odd rows they lie between two,
// with shares west, east (row j >> 1 of each array).
export function restrictRedAlong(
  single: usize,
  size: usize,
  stride: usize,
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
    const row = singleRow(single, stride, j) + REST * size
    const coarseRow = rowAt(coarse, coarseStride, j) + B * coarseSize
    if (j & 1) {
      const share = rowAt(shares, stride, j >> 1)
      for (let o: usize = 0; o < stride - 16; o += 16) {
        const east = f32x4.mul(v128.load(share + o), v128.load(row + o))
        const west = f32x4.mul(v128.load(share + o + sharesSize - 4), v128.load(row + o - 4))
        v128.store(natural + o, f32x4.add(west, east))
      }
      splitRow(natural, coarseRow, coarseHalf)
    } else {
      for (let o: usize = 0; o < stride - 16; o += 16) v128.store(natural + o, v128.load(row + o))
      splitRow(natural, coarseRow, coarseHalf)
    }
  }
}

export function correctRedAlong(
  single: usize,
  size: usize,
  stride: usize,
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
    const row = singleRow(single, stride, j)
    if (j & 1) {
      const share = rowAt(shares, stride, j >> 1)
      for (let o: usize = 0; o < stride - 16; o += 16) {
        const e = f32x4.add(
          f32x4.mul(v128.load(share + o), v128.load(natural + o)),
          f32x4.mul(v128.load(share + o + sharesSize), v128.load(natural + o + 4)),
        )
        v128.store(row + o + Z * size, f32x4.add(v128.load(row + o + SCALED * size), e))
      }
    } else {
      for (let o: usize = 0; o < stride - 16; o += 16) {
        const e = v128.load(natural + o)
        v128.store(row + o + Z * size, f32x4.add(v128.load(row + o + SCALED * size), e))
      }
    }
  }
}
