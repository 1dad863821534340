import { EAST, NORTH, NORTH_EAST, NORTH_WEST, OWN, cellAt } from './layout'

// Inverse of the coarsest level's matrix, for `dense`: n = columns * rows rows of `width` bytes in single precision.
// Gauss-Jordan elimination in double precision without exchanging rows, which a positive definite matrix does not need;
// a pivot lost to rounding leaves its cell at 0. `work`: n rows of n doubles, n made even, a row `wide` bytes.
export function invertCoarsest(
  level: usize,
  size: usize,
  stride: usize,
  half: usize,
  columns: i32,
  rows: i32,
  inverse: usize,
  width: usize,
  work: usize,
  wide: usize,
): void {
  const n = columns * rows
  for (let c = 0; c < n; c++) {
    const row = work + <usize>c * wide
    for (let o: usize = 0; o < wide; o += 8) store<f64>(row + o, 0)
  }
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const c = j * columns + i
      const at = cellAt(level, stride, half, i, j)
      add(work, wide, c, c, load<f32>(at + OWN * size))
      if (i + 1 < columns) join(work, wide, c, c + 1, load<f32>(at + EAST * size))
      if (j + 1 >= rows) continue
      join(work, wide, c, c + columns, load<f32>(at + NORTH * size))
      if (i + 1 < columns) join(work, wide, c, c + columns + 1, load<f32>(at + NORTH_EAST * size))
      if (i > 0) join(work, wide, c, c + columns - 1, load<f32>(at + NORTH_WEST * size))
    }
  }
  for (let k = 0; k < n; k++) {
    const whole = diagonalOf(level, size, stride, half, k % columns, k / columns)
    const pivotRow = work + <usize>k * wide
    const pivot = load<f64>(pivotRow + (<usize>k << 3))
    const kept = pivot > 1e-14 * whole
    const unit: f64 = kept ? 1 / pivot : 0
    for (let o: usize = 0; o < wide; o += 16) v128.store(pivotRow + o, f64x2.mul(v128.load(pivotRow + o), f64x2.splat(unit)))
    store<f64>(pivotRow + (<usize>k << 3), unit)
    for (let i = 0; i < n; i++) {
      if (i === k) continue
      const row = work + <usize>i * wide
      const factor = load<f64>(row + (<usize>k << 3))
      store<f64>(row + (<usize>k << 3), 0)
      if (factor === 0) continue
      const times = f64x2.splat(factor)
      for (let o: usize = 0; o < wide; o += 16) {
        v128.store(row + o, f64x2.sub(v128.load(row + o), f64x2.mul(times, v128.load(pivotRow + o))))
      }
    }
  }
  for (let r = 0; r < n; r++) {
    for (let c = 0; c < n; c++) {
      const value = load<f64>(work + <usize>r * wide + (<usize>c << 3))
      const other = load<f64>(work + <usize>c * wide + (<usize>r << 3))
      store<f32>(inverse + <usize>r * width + (<usize>c << 2), <f32>(0.5 * (value + other)))
    }
  }
}

function add(work: usize, wide: usize, row: i32, column: i32, value: f64): void {
  const at = work + <usize>row * wide + (<usize>column << 3)
  store<f64>(at, load<f64>(at) + value)
}

function join(work: usize, wide: usize, a: i32, b: i32, link: f64): void {
  add(work, wide, a, a, link)
  add(work, wide, b, b, link)
  add(work, wide, a, b, -link)
  add(work, wide, b, a, -link)
}

function diagonalOf(level: usize, size: usize, stride: usize, half: usize, i: i32, j: i32): f64 {
  let sum: f64 = load<f32>(cellAt(level + OWN * size, stride, half, i, j))
  sum += load<f32>(cellAt(level + EAST * size, stride, half, i, j))
  sum += load<f32>(cellAt(level + EAST * size, stride, half, i - 1, j))
  sum += load<f32>(cellAt(level + NORTH * size, stride, half, i, j))
  sum += load<f32>(cellAt(level + NORTH * size, stride, half, i, j - 1))
  sum += load<f32>(cellAt(level + NORTH_EAST * size, stride, half, i, j))
  sum += load<f32>(cellAt(level + NORTH_EAST * size, stride, half, i - 1, j - 1))
  sum += load<f32>(cellAt(level + NORTH_WEST * size, stride, half, i, j))
  sum += load<f32>(cellAt(level + NORTH_WEST * size, stride, half, i + 1, j - 1))
  return sum
}
