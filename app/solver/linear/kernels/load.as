import {
  BLACK_INVERSE,
  BLACK_OWN,
  BLACK_UNIT,
  EAST,
  NORTH,
  RED_INVERSE,
  RED_OWN,
  SOUTH,
  WEST,
  doubleRow,
  singleRow,
} from './colours'

// Numbers 0 and 2, or 1 and 3, of the four at a.
// @ts-ignore: decorator
@inline
function evens(a: usize): v128 {
  return v128.shuffle<f64>(v128.load(a), v128.load(a, 16), 0, 2)
}

// @ts-ignore: decorator
@inline
function odds(a: usize): v128 {
  return v128.shuffle<f64>(v128.load(a), v128.load(a, 16), 1, 3)
}

// @ts-ignore: decorator
@inline
function unitOf(own: v128, west: v128, east: v128, south: v128, north: v128): v128 {
  const links = f64x2.add(f64x2.add(west, east), f64x2.add(south, north))
  const diagonal = f64x2.add(own, links)
  return v128.and(f64x2.div(f64x2.splat(1), diagonal), f64x2.gt(diagonal, f64x2.splat(0)))
}

// @ts-ignore: decorator
@inline
function storeBoth(c1: usize, c2: usize, values: v128): void {
  v128.store(c2, values)
  v128.store64_lane(c1, f32x4.demote_f64x2_zero(values), 0)
}

// Two red cells' numbers at c1 in single and at c2 in double precision.
// @ts-ignore: decorator
@inline
function storeRed(
  c1: usize,
  size: usize,
  c2: usize,
  own: v128,
  west: v128,
  east: v128,
  south: v128,
  north: v128,
): i32 {
  const two = 2 * size
  const unit = unitOf(own, west, east, south, north)
  storeBoth(c1 + WEST * size, c2 + WEST * two, west)
  storeBoth(c1 + EAST * size, c2 + EAST * two, east)
  storeBoth(c1 + SOUTH * size, c2 + SOUTH * two, south)
  storeBoth(c1 + NORTH * size, c2 + NORTH * two, north)
  v128.store(c2 + RED_OWN * two, own)
  v128.store64_lane(c1 + RED_INVERSE * size, f32x4.demote_f64x2_zero(unit), 0)
  return i64x2.all_true(unit) ? 0 : 1
}

// @ts-ignore: decorator
@inline
function storeBlack(
  c1: usize,
  size: usize,
  c2: usize,
  own: v128,
  west: v128,
  east: v128,
  south: v128,
  north: v128,
): i32 {
  const two = 2 * size
  const unit = unitOf(own, west, east, south, north)
  v128.store(c2 + BLACK_UNIT * two, unit)
  v128.store(c2 + BLACK_OWN * two, own)
  v128.store64_lane(c1 + BLACK_INVERSE * size, f32x4.demote_f64x2_zero(unit), 0)
  return i64x2.all_true(unit) ? 0 : 1
}

// Reads rows from..to - 1 of a five-point system as it is given and lays it out by colours: `east` and `own` at row
// `from`, `north` at row from - 1, `columns` doubles a row. Links out of the grid are made 0 where they are read; eight
// bytes before `east` are there to be written to. Returns 0 when every cell has an equation.
export function load5(
  single: usize,
  size: usize,
  stride: usize,
  double: usize,
  columns: i32,
  rows: i32,
  eastGiven: usize,
  northGiven: usize,
  ownGiven: usize,
  from: i32,
  to: i32,
): i32 {
  let gaps = 0
  const two = 2 * size
  const width = <usize>columns << 3
  let e = eastGiven
  let o = ownGiven
  let n = northGiven + width
  store<f64>(e - 8, 0)
  if (from === 0) memory.fill(northGiven, 0, width)
  if (to === rows) memory.fill(northGiven + <usize>(to - from) * width, 0, width)
  for (let j = from; j < to; j++) {
    let c1 = singleRow(single, stride, j)
    let c2 = doubleRow(double, stride, j)
    const oddRow = j & 1
    store<f64>(e + width - 8, 0)
    let i = 0
    for (; i + 4 <= columns; i += 4, e += 32, o += 32, n += 32, c1 += 8, c2 += 16) {
      const s = n - width
      if (oddRow) {
        gaps |= storeBlack(c1, size, c2, evens(o), evens(e - 8), evens(e), evens(s), evens(n))
        gaps |= storeRed(c1, size, c2, odds(o), odds(e - 8), odds(e), odds(s), odds(n))
      } else {
        gaps |= storeRed(c1, size, c2, evens(o), evens(e - 8), evens(e), evens(s), evens(n))
        gaps |= storeBlack(c1, size, c2, odds(o), odds(e - 8), odds(e), odds(s), odds(n))
      }
    }
    for (; i < columns; i++, e += 8, o += 8, n += 8) {
      const west = load<f64>(e - 8)
      const east = load<f64>(e)
      const south = load<f64>(n - width)
      const north = load<f64>(n)
      const own = load<f64>(o)
      const diagonal = own + west + east + south + north
      const unit = diagonal > 0 ? 1 / diagonal : 0
      if (unit === 0) gaps = 1
      const d1 = c1 + (<usize>((i & 3) >> 1) << 2)
      const d2 = c2 + (<usize>((i & 3) >> 1) << 3)
      if ((i + j) & 1) {
        store<f64>(d2 + BLACK_UNIT * two, unit)
        store<f64>(d2 + BLACK_OWN * two, own)
        store<f32>(d1 + BLACK_INVERSE * size, <f32>unit)
      } else {
        store<f64>(d2 + WEST * two, west)
        store<f64>(d2 + EAST * two, east)
        store<f64>(d2 + SOUTH * two, south)
        store<f64>(d2 + NORTH * two, north)
        store<f64>(d2 + RED_OWN * two, own)
        store<f32>(d1 + WEST * size, <f32>west)
        store<f32>(d1 + EAST * size, <f32>east)
        store<f32>(d1 + SOUTH * size, <f32>south)
        store<f32>(d1 + NORTH * size, <f32>north)
        store<f32>(d1 + RED_INVERSE * size, <f32>unit)
      }
    }
  }
  return gaps
}

// Numbers of rows from..to - 1 in the order of the cells, to red and black arrays of double precision.
export function parted(
  size: usize,
  stride: usize,
  double: usize,
  columns: i32,
  given: usize,
  red: usize,
  black: usize,
  from: i32,
  to: i32,
): void {
  const two = 2 * size
  let c = given
  for (let j = from; j < to; j++) {
    const row = doubleRow(double, stride, j)
    let even = row + (j & 1 ? black : red) * two
    let odd = row + (j & 1 ? red : black) * two
    let i = 0
    for (; i + 4 <= columns; i += 4, c += 32, even += 16, odd += 16) {
      const a = v128.load(c)
      const b = v128.load(c, 16)
      v128.store(even, v128.shuffle<f64>(a, b, 0, 2))
      v128.store(odd, v128.shuffle<f64>(a, b, 1, 3))
    }
    for (; i < columns; i++, c += 8) store<f64>((i & 1 ? odd : even) + (<usize>((i & 3) >> 1) << 3), load<f64>(c))
  }
}

// The other way round, for a system with an equation for every cell.
export function joined(
  size: usize,
  stride: usize,
  double: usize,
  columns: i32,
  into: usize,
  red: usize,
  black: usize,
  from: i32,
  to: i32,
): void {
  const two = 2 * size
  let c = into
  for (let j = from; j < to; j++) {
    const row = doubleRow(double, stride, j)
    let even = row + (j & 1 ? black : red) * two
    let odd = row + (j & 1 ? red : black) * two
    let i = 0
    for (; i + 4 <= columns; i += 4, c += 32, even += 16, odd += 16) {
      const a = v128.load(even)
      const b = v128.load(odd)
      v128.store(c, v128.shuffle<f64>(a, b, 0, 2))
      v128.store(c, v128.shuffle<f64>(a, b, 1, 3), 16)
    }
    for (; i < columns; i++, c += 8) store<f64>(c, load<f64>((i & 1 ? odd : even) + (<usize>((i & 3) >> 1) << 3)))
  }
}

// The same where some cells have no equation: they are left as they are.
export function joinedWithGaps(
  single: usize,
  size: usize,
  stride: usize,
  double: usize,
  columns: i32,
  into: usize,
  red: usize,
  black: usize,
  from: i32,
  to: i32,
): void {
  const two = 2 * size
  let c = into
  for (let j = from; j < to; j++) {
    const d = doubleRow(double, stride, j)
    const s = singleRow(single, stride, j)
    for (let i = 0; i < columns; i++, c += 8) {
      const k = <usize>(i >> 1)
      const isBlack = (i + j) & 1
      const inverse = load<f32>(s + (k << 2) + (isBlack ? BLACK_INVERSE : RED_INVERSE) * size)
      if (inverse > 0) store<f64>(c, load<f64>(d + (k << 3) + (isBlack ? black : red) * two))
    }
  }
}
