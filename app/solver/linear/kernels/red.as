import {
  BLACK,
  EAST,
  NORTH,
  RED_INVERSE,
  RED_R,
  REST,
  SCALED,
  SOUTH,
  WEST,
  Z,
  doubleRow,
  singleRow,
} from './colours'

// Sum of a x over the black neighbours of four red cells. West and east of a red cell: black places k - 1 and k in even
// rows, k and k + 1 in odd ones.
// @ts-ignore: decorator
@inline
function around(c: usize, size: usize, stride: usize, w: usize): v128 {
  const x = c + BLACK * size
  const west = f32x4.mul(v128.load(c + WEST * size), v128.load(x + w))
  const east = f32x4.mul(v128.load(c + EAST * size), v128.load(x + w + 4))
  const south = f32x4.mul(v128.load(c + SOUTH * size), v128.load(x - stride))
  const north = f32x4.mul(v128.load(c + NORTH * size), v128.load(x + stride))
  return f32x4.add(f32x4.add(west, east), f32x4.add(south, north))
}

// Residual of the red cells of rows from..to - 1 once red x = r / D and then the black cells were relaxed from 0: sum a x.
export function redRest(single: usize, size: usize, stride: usize, from: i32, to: i32): void {
  for (let j = from; j < to; j++) {
    const row = singleRow(single, stride, j)
    const w: usize = j & 1 ? 0 : <usize>-4
    for (let c = row; c < row + stride - 16; c += 16) v128.store(c + REST * size, around(c, size, stride, w))
  }
}

// Last step of the cycle, on the red cells of rows from..to - 1: z = (r + sum a x) / D, with r / D as it was scaled
// before. Returns scale * (r . z), summed in double precision.
export function redLast(
  single: usize,
  size: usize,
  stride: usize,
  double: usize,
  from: i32,
  to: i32,
): f64 {
  let dot = f64x2.splat(0)
  for (let j = from; j < to; j++) {
    const row = singleRow(single, stride, j)
    const w: usize = j & 1 ? 0 : <usize>-4
    let r = doubleRow(double, stride, j) + RED_R * 2 * size
    for (let c = row; c < row + stride - 16; c += 16, r += 32) {
      const more = f32x4.mul(v128.load(c + RED_INVERSE * size), around(c, size, stride, w))
      const z = f32x4.add(v128.load(c + SCALED * size), more)
      v128.store(c + Z * size, z)
      dot = f64x2.add(dot, f64x2.mul(v128.load(r), f64x2.promote_low_f32x4(z)))
      const high = v128.shuffle<f32>(z, z, 2, 3, 2, 3)
      dot = f64x2.add(dot, f64x2.mul(v128.load(r, 16), f64x2.promote_low_f32x4(high)))
    }
  }
  return f64x2.extract_lane(dot, 0) + f64x2.extract_lane(dot, 1)
}
