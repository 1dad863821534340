import {
  BLACK_OWN,
  BLACK_UNIT,
  EAST,
  NORTH,
  P,
  Q,
  RED_INVERSE,
  RED_OWN,
  RED_R,
  RED_X,
  SCALED,
  SOUTH,
  WEST,
  Z,
  doubleRow,
  singleRow,
} from './colours'

// Conjugate gradients in double precision on the red cells, the black ones eliminated exactly (the reduced system,
// Hageman & Young 1981, chapter 9): with x_black = sum a x_red / D the product on red cells is
//   q = own p + sum a (p - p_black).

// p = z + beta p, rows from..to - 1; with beta = 0 whatever p held is gone.
export function direction(
  single: usize,
  size: usize,
  stride: usize,
  double: usize,
  beta: f64,
  from: i32,
  to: i32,
): void {
  const factor = f64x2.splat(beta)
  for (let j = from; j < to; j++) {
    const row = singleRow(single, stride, j) + Z * size
    let p = doubleRow(double, stride, j) + P * 2 * size
    for (let c = row; c < row + stride - 16; c += 16, p += 32) {
      const z = v128.load(c)
      const low = f64x2.promote_low_f32x4(z)
      const high = f64x2.promote_low_f32x4(v128.shuffle<f32>(z, z, 2, 3, 2, 3))
      if (beta === 0) {
        v128.store(p, low)
        v128.store(p, high, 16)
        continue
      }
      v128.store(p, f64x2.add(low, f64x2.mul(factor, v128.load(p))))
      v128.store(p, f64x2.add(high, f64x2.mul(factor, v128.load(p, 16))), 16)
    }
  }
}

// Black cells of rows from..to - 1 from the red values in array `source`: x = (b + sum a x_red) / D, in place of b
// (`withSource`), or with b = 0.
export function eliminate(
  size: usize,
  stride: usize,
  double: usize,
  source: usize,
  withSource: i32,
  from: i32,
  to: i32,
): void {
  const two = 2 * size
  const row2 = 2 * stride
  const x = source * two
  for (let j = from; j < to; j++) {
    const row = doubleRow(double, stride, j)
    const w: usize = j & 1 ? <usize>-8 : 0
    for (let c = row; c < row + row2 - 32; c += 16) {
      const west = f64x2.mul(v128.load(c + w + EAST * two), v128.load(c + w + x))
      const east = f64x2.mul(v128.load(c + w + 8 + WEST * two), v128.load(c + w + 8 + x))
      const south = f64x2.mul(v128.load(c - row2 + NORTH * two), v128.load(c - row2 + x))
      const north = f64x2.mul(v128.load(c + row2 + SOUTH * two), v128.load(c + row2 + x))
      let sum = f64x2.add(f64x2.add(west, east), f64x2.add(south, north))
      if (withSource) sum = f64x2.add(sum, v128.load(c + BLACK_OWN * two))
      v128.store(c + BLACK_OWN * two, f64x2.mul(v128.load(c + BLACK_UNIT * two), sum))
    }
  }
}

// Sum of a (x - x_black), for two red cells at c with values `here`.
// @ts-ignore: decorator
@inline
function flows(c: usize, two: usize, row2: usize, w: usize, here: v128): v128 {
  const x = c + BLACK_OWN * two
  const west = f64x2.mul(v128.load(c + WEST * two), f64x2.sub(here, v128.load(x + w)))
  const east = f64x2.mul(v128.load(c + EAST * two), f64x2.sub(here, v128.load(x + w + 8)))
  const south = f64x2.mul(v128.load(c + SOUTH * two), f64x2.sub(here, v128.load(x - row2)))
  const north = f64x2.mul(v128.load(c + NORTH * two), f64x2.sub(here, v128.load(x + row2)))
  return f64x2.add(f64x2.add(west, east), f64x2.add(south, north))
}

// q = own p + sum a (p - p_black), rows from..to - 1. Returns p . q.
export function product(size: usize, stride: usize, double: usize, from: i32, to: i32): f64 {
  const two = 2 * size
  const row2 = 2 * stride
  let dot = f64x2.splat(0)
  for (let j = from; j < to; j++) {
    const row = doubleRow(double, stride, j)
    const w: usize = j & 1 ? 0 : <usize>-8
    for (let c = row; c < row + row2 - 32; c += 16) {
      const p = v128.load(c + P * two)
      const q = f64x2.add(f64x2.mul(v128.load(c + RED_OWN * two), p), flows(c, two, row2, w, p))
      v128.store(c + Q * two, q)
      dot = f64x2.add(dot, f64x2.mul(p, q))
    }
  }
  return f64x2.extract_lane(dot, 0) + f64x2.extract_lane(dot, 1)
}

// r = b - own x - sum a (x - x_black) on red cells, b in the place of q; and the scaled residual for the cycle. Rows
// from..to - 1; returns r . r.
export function trueResidual(
  single: usize,
  size: usize,
  stride: usize,
  double: usize,
  scale: f64,
  from: i32,
  to: i32,
): f64 {
  const two = 2 * size
  const row2 = 2 * stride
  let dot = f64x2.splat(0)
  for (let j = from; j < to; j++) {
    const row = doubleRow(double, stride, j)
    const w: usize = j & 1 ? 0 : <usize>-8
    for (let c = row; c < row + row2 - 32; c += 16) {
      const x = v128.load(c + RED_X * two)
      const held = f64x2.mul(v128.load(c + RED_OWN * two), x)
      const r = f64x2.sub(f64x2.sub(v128.load(c + Q * two), held), flows(c, two, row2, w, x))
      v128.store(c + RED_R * two, r)
      dot = f64x2.add(dot, f64x2.mul(r, r))
    }
    scaleRow(single, size, stride, double, scale, j)
  }
  return f64x2.extract_lane(dot, 0) + f64x2.extract_lane(dot, 1)
}

// The cycle's right-hand side in single precision: scale r / D.
// @ts-ignore: decorator
@inline
function scaleRow(single: usize, size: usize, stride: usize, double: usize, scale: f64, j: i32): void {
  const factor = f64x2.splat(scale)
  const row = singleRow(single, stride, j)
  let r = doubleRow(double, stride, j) + RED_R * 2 * size
  for (let c = row; c < row + stride - 16; c += 16, r += 32) {
    const low = f32x4.demote_f64x2_zero(f64x2.mul(factor, v128.load(r)))
    const high = f32x4.demote_f64x2_zero(f64x2.mul(factor, v128.load(r, 16)))
    const both = v128.shuffle<f32>(low, high, 0, 1, 4, 5)
    v128.store(c + SCALED * size, f32x4.mul(v128.load(c + RED_INVERSE * size), both))
  }
}

// x += alpha p, r -= alpha q, and the scaled residual for the next cycle; rows from..to - 1. Returns r . r.
export function step(
  single: usize,
  size: usize,
  stride: usize,
  double: usize,
  alpha: f64,
  scale: f64,
  from: i32,
  to: i32,
): f64 {
  const two = 2 * size
  const row2 = 2 * stride
  const factor = f64x2.splat(alpha)
  let dot = f64x2.splat(0)
  for (let j = from; j < to; j++) {
    const row = doubleRow(double, stride, j)
    for (let c = row; c < row + row2 - 32; c += 16) {
      const x = f64x2.add(v128.load(c + RED_X * two), f64x2.mul(factor, v128.load(c + P * two)))
      v128.store(c + RED_X * two, x)
      const r = f64x2.sub(v128.load(c + RED_R * two), f64x2.mul(factor, v128.load(c + Q * two)))
      v128.store(c + RED_R * two, r)
      dot = f64x2.add(dot, f64x2.mul(r, r))
    }
    scaleRow(single, size, stride, double, scale, j)
  }
  return f64x2.extract_lane(dot, 0) + f64x2.extract_lane(dot, 1)
}

// Largest |p| of rows from..to - 1.
export function largest(size: usize, stride: usize, double: usize, array: usize, from: i32, to: i32): f64 {
  let most = f64x2.splat(0)
  for (let j = from; j < to; j++) {
    const row = doubleRow(double, stride, j) + array * 2 * size
    for (let c = row; c < row + 2 * stride - 32; c += 16) most = f64x2.max(most, f64x2.abs(v128.load(c)))
  }
  return Math.max(f64x2.extract_lane(most, 0), f64x2.extract_lane(most, 1))
}
