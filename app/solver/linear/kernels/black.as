import { BLACK, BLACK_INVERSE, EAST, NORTH, SOUTH, WEST, singleRow } from './colours'

// Relaxes the black cells of rows from..to - 1, right-hand side 0, from the red values in array `source`:
//   x = (sum a x_red) / D
export function black(single: usize, size: usize, stride: usize, source: usize, from: i32, to: i32): void {
  const x = source * size
  for (let j = from; j < to; j++) {
    const row = singleRow(single, stride, j)
    // West and east of a black cell: red places k and k + 1 in even rows, k - 1 and k in odd ones.
    const w: usize = j & 1 ? <usize>-4 : 0
    for (let c = row; c < row + stride - 16; c += 16) {
      const west = f32x4.mul(v128.load(c + w + EAST * size), v128.load(c + w + x))
      const east = f32x4.mul(v128.load(c + w + 4 + WEST * size), v128.load(c + w + 4 + x))
      const south = f32x4.mul(v128.load(c - stride + NORTH * size), v128.load(c - stride + x))
      const north = f32x4.mul(v128.load(c + stride + SOUTH * size), v128.load(c + stride + x))
      const sum = f32x4.add(f32x4.add(west, east), f32x4.add(south, north))
      v128.store(c + BLACK * size, f32x4.mul(v128.load(c + BLACK_INVERSE * size), sum))
    }
  }
}
