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

// Reads rows from..to - 1 of a five-point system as it is given: `east` and `own` at row `from`, `north` at row from - 1,
// `columns` doubles a row (links out of the grid are taken as 0), and lays it out by colours. Returns the number of
// cells without an equation.
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
  for (let j = from; j < to; j++) {
    const s = singleRow(single, stride, j)
    const d = doubleRow(double, stride, j)
    let west: f64 = 0
    for (let i = 0; i < columns; i++, e += 8, o += 8, n += 8) {
      const east: f64 = i < columns - 1 ? load<f64>(e) : 0
      const south: f64 = j > 0 ? load<f64>(n - width) : 0
      const north: f64 = j < rows - 1 ? load<f64>(n) : 0
      const own = load<f64>(o)
      const diagonal = own + west + east + south + north
      const unit = diagonal > 0 ? 1 / diagonal : 0
      if (unit === 0) gaps++
      const c1 = s + (<usize>(i >> 1) << 2)
      const c2 = d + (<usize>(i >> 1) << 3)
      if ((i + j) & 1) {
        store<f64>(c2 + BLACK_UNIT * two, unit)
        store<f64>(c2 + BLACK_OWN * two, own)
        store<f32>(c1 + BLACK_INVERSE * size, <f32>unit)
      } else {
        store<f64>(c2 + WEST * two, west)
        store<f64>(c2 + EAST * two, east)
        store<f64>(c2 + SOUTH * two, south)
        store<f64>(c2 + NORTH * two, north)
        store<f64>(c2 + RED_OWN * two, own)
        store<f32>(c1 + WEST * size, <f32>west)
        store<f32>(c1 + EAST * size, <f32>east)
        store<f32>(c1 + SOUTH * size, <f32>south)
        store<f32>(c1 + NORTH * size, <f32>north)
        store<f32>(c1 + RED_INVERSE * size, <f32>unit)
      }
      west = east
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
