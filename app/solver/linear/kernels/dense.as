// x = M b on the coarsest level: M the inverse of its matrix, n rows of `width` bytes (a multiple of 16, padded with
// zeros); b and x in the level's rows, `natural` and `natural` + width as memory for both in the order of the cells.
import { B, X, cellAt } from './layout'

export function dense(
  level: usize,
  size: usize,
  stride: usize,
  half: usize,
  columns: i32,
  rows: i32,
  inverse: usize,
  width: usize,
  natural: usize,
): void {
  let k = natural
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++, k += 4) store<f32>(k, load<f32>(cellAt(level + B * size, stride, half, i, j)))
  }
  let row = inverse
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++, row += width) {
      let sum = f32x4.splat(0)
      for (let o: usize = 0; o < width; o += 16) {
        sum = f32x4.add(sum, f32x4.mul(v128.load(row + o), v128.load(natural + o)))
      }
      const value =
        f32x4.extract_lane(sum, 0) +
        f32x4.extract_lane(sum, 1) +
        (f32x4.extract_lane(sum, 2) + f32x4.extract_lane(sum, 3))
      store<f32>(cellAt(level + X * size, stride, half, i, j), value)
    }
  }
}
