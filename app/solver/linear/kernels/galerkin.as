import { EAST, NORTH, NORTH_EAST, NORTH_WEST, OWN, cellAt, rowAt } from './layout'

// From one nine-point level to the next: interpolation by the operator and the Galerkin matrix, as galerkin-red.as has
// them, with the links to corners. Between two coarse cells the links of the other direction are summed into the two
// (Dendy 1982); a negative sum counts nothing.

// The level whose numbers are asked for.
let level: usize = 0
let size: usize = 0
let stride: usize = 0
let half: usize = 0

// @ts-ignore: decorator
@inline
function at(array: usize, i: i32, j: i32): f64 {
  return load<f32>(cellAt(level, stride, half, i, j) + array * size)
}

// @ts-ignore: decorator
@inline
function aE(i: i32, j: i32): f64 {
  return at(EAST, i, j)
}

// @ts-ignore: decorator
@inline
function aN(i: i32, j: i32): f64 {
  return at(NORTH, i, j)
}

// @ts-ignore: decorator
@inline
function aNE(i: i32, j: i32): f64 {
  return at(NORTH_EAST, i, j)
}

// @ts-ignore: decorator
@inline
function aNW(i: i32, j: i32): f64 {
  return at(NORTH_WEST, i, j)
}

// @ts-ignore: decorator
@inline
function positive(value: f64): f64 {
  return value > 0 ? value : 0
}

// Links of cell (i, j) to all that lies west, east, south and north of it.
function west(i: i32, j: i32): f64 {
  return aE(i - 1, j) + aNE(i - 1, j - 1) + aNW(i, j)
}

function east(i: i32, j: i32): f64 {
  return aE(i, j) + aNE(i, j) + aNW(i + 1, j - 1)
}

function south(i: i32, j: i32): f64 {
  return aN(i, j - 1) + aNE(i - 1, j - 1) + aNW(i + 1, j - 1)
}

function north(i: i32, j: i32): f64 {
  return aN(i, j) + aNE(i, j) + aNW(i, j)
}

// What a side with links `links` counts beside the opposite one with `opposite`. A negative sum counts nothing; when
// neither side has a positive one, their sizes count.
// @ts-ignore: decorator
@inline
function counted(links: f64, opposite: f64): f64 {
  return links > 0 ? links : opposite > 0 ? 0 : -links
}

function diagonal(i: i32, j: i32): f64 {
  const row = at(OWN, i, j) + aE(i - 1, j) + aE(i, j)
  const above = aN(i, j) + aNE(i, j) + aNW(i, j)
  return row + above + aN(i, j - 1) + aNE(i - 1, j - 1) + aNW(i + 1, j - 1)
}

function hold(levelGiven: usize, sizeGiven: usize, strideGiven: usize, halfGiven: usize): void {
  level = levelGiven
  size = sizeGiven
  stride = strideGiven
  half = halfGiven
}

// Shares west, east of the odd columns of even rows (or, `along`, of every row), row J of each array from..to - 1, and
// south, north of the even columns of odd rows.
export function sharesOf(
  levelGiven: usize,
  sizeGiven: usize,
  strideGiven: usize,
  halfGiven: usize,
  columns: i32,
  rows: i32,
  shares: usize,
  sharesSize: usize,
  along: i32,
  from: i32,
  to: i32,
): void {
  hold(levelGiven, sizeGiven, strideGiven, halfGiven)
  const row = strideGiven
  for (let J = from; J < to; J++) {
    const j = along ? J : 2 * J
    let s = rowAt(shares, half, J)
    // The cell at c is in an odd column: `back` has the even column west of it, `on` the one east.
    let c = rowAt(level, row, j) + half
    for (let i = 1; i < columns; i += 2, s += 4, c += 4) {
      const back = c - half
      const on = back + 4
      const w = link(back, EAST) + link(back - row, NORTH_EAST) + link(c, NORTH_WEST)
      const e = link(c, EAST) + link(c, NORTH_EAST) + link(on - row, NORTH_WEST)
      share(s, sharesSize, w, e, link(c, OWN))
    }
    if (along || j + 1 >= rows) continue
    s = rowAt(shares, half, J) + 2 * sharesSize
    c = rowAt(level, row, j + 1)
    for (let i = 0; i < columns; i += 2, s += 4, c += 4) {
      const below = c - row
      const b = link(below, NORTH) + link(below + half - 4, NORTH_EAST) + link(below + half, NORTH_WEST)
      const a = link(c, NORTH) + link(c, NORTH_EAST) + link(c, NORTH_WEST)
      share(s, sharesSize, b, a, link(c, OWN))
    }
  }
}

// Number of `array` of the cell that is at c in the first one.
// @ts-ignore: decorator
@inline
function link(c: usize, array: usize): f64 {
  return load<f32>(c + array * size)
}

// @ts-ignore: decorator
@inline
function share(s: usize, apart: usize, low: f64, high: f64, own: f64): void {
  const a = counted(low, high)
  const b = counted(high, low)
  const sum = a + b + positive(own)
  const unit: f64 = sum > 0 ? 1 / sum : 0
  store<f32>(s, <f32>(a * unit))
  store<f32>(s + apart, <f32>(b * unit))
}

// 1 minus the shares of the odd column i of row j, of the even column of odd row j, and of the cell in the middle of four.
function defectAlong(i: i32, j: i32): f64 {
  const held = positive(at(OWN, i, j))
  return held > 0 ? held / (counted(west(i, j), east(i, j)) + counted(east(i, j), west(i, j)) + held) : 0
}

function defectUp(i: i32, j: i32): f64 {
  const held = positive(at(OWN, i, j))
  return held > 0 ? held / (counted(south(i, j), north(i, j)) + counted(north(i, j), south(i, j)) + held) : 0
}

function defectMiddle(i: i32, j: i32): f64 {
  const d = diagonal(i, j)
  if (!(d > 0)) return 0
  const sides = aE(i - 1, j) * defectUp(i - 1, j) + aE(i, j) * defectUp(i + 1, j)
  const ends = aN(i, j - 1) * defectAlong(i, j - 1) + aN(i, j) * defectAlong(i, j + 1)
  return (at(OWN, i, j) + sides + ends) / d
}

// Four shares of the middle cells of fine row 2 J + 1: south-west, south-east, north-west, north-east, as doubles, each
// array `apart` bytes on from the last; zeros where there is no such row.
function middleRow(columns: i32, rows: i32, J: i32, shares: usize, sharesSize: usize, into: usize, apart: usize): void {
  const j = 2 * J + 1
  let to = into
  let s = rowAt(shares, half, J)
  if (j < 0 || j >= rows) {
    for (let i = 1; i <= columns; i += 2, to += 8) {
      store<f64>(to, 0)
      store<f64>(to + apart, 0)
      store<f64>(to + 2 * apart, 0)
      store<f64>(to + 3 * apart, 0)
    }
    return
  }
  // The cell at c is in an odd column; past the last column everything is zero.
  let c = rowAt(level, stride, j) + half
  for (let i = 1; i <= columns; i += 2, to += 8, s += 4, c += 4) {
    const back = c - half
    const below = c - stride
    const w = link(back, EAST)
    const e = link(c, EAST)
    const b = link(below, NORTH)
    const a = link(c, NORTH)
    const sw = link(back - stride, NORTH_EAST)
    const se = link(back + 4 - stride, NORTH_WEST)
    const nw = link(c, NORTH_WEST)
    const ne = link(c, NORTH_EAST)
    const d = link(c, OWN) + w + e + b + a + sw + se + nw + ne
    const unit: f64 = i < columns && d > 0 ? 1 / d : 0
    const wBelow: f64 = load<f32>(s)
    const eBelow: f64 = load<f32>(s + sharesSize)
    const wAbove: f64 = load<f32>(s + half)
    const eAbove: f64 = load<f32>(s + half + sharesSize)
    const soLeft: f64 = load<f32>(s + 2 * sharesSize)
    const noLeft: f64 = load<f32>(s + 3 * sharesSize)
    const soRight: f64 = load<f32>(s + 2 * sharesSize + 4)
    const noRight: f64 = load<f32>(s + 3 * sharesSize + 4)
    store<f64>(to, unit * (sw + w * soLeft + b * wBelow))
    store<f64>(to + apart, unit * (se + e * soRight + b * eBelow))
    store<f64>(to + 2 * apart, unit * (nw + w * noLeft + a * wAbove))
    store<f64>(to + 3 * apart, unit * (ne + e * noRight + a * eAbove))
  }
}

// Coarse rows from..to - 1, every second row and column left out. `scratch`: 2 * 4 rows of doubles, a row `apart` bytes.
export function galerkinBoth(
  levelGiven: usize,
  sizeGiven: usize,
  strideGiven: usize,
  halfGiven: usize,
  columns: i32,
  rows: i32,
  shares: usize,
  sharesSize: usize,
  coarse: usize,
  coarseSize: usize,
  coarseStride: usize,
  coarseHalf: usize,
  scratch: usize,
  apart: usize,
  from: i32,
  to: i32,
): void {
  hold(levelGiven, sizeGiven, strideGiven, halfGiven)
  middleRow(columns, rows, from - 1, shares, sharesSize, scratch + <usize>((from - 1) & 1) * 4 * apart, apart)
  for (let J = from; J < to; J++) {
    const j = 2 * J
    let m = scratch + <usize>(J & 1) * 4 * apart
    let mBelow = scratch + <usize>((J - 1) & 1) * 4 * apart
    middleRow(columns, rows, J, shares, sharesSize, m, apart)
    let s = rowAt(shares, half, J)
    let pNWLeft: f64 = 0
    let pNELeft: f64 = 0
    // c: the cell in its even column and row; o and l: east and west of it; up: in the row above.
    let c = rowAt(level, stride, j)
    for (let I = 0; 2 * I < columns; I++, s += 4, m += 8, mBelow += 8, c += 4) {
      const i = 2 * I
      const o = c + half
      const l = o - 4
      const up = c + stride
      const down = c - stride
      const w: f64 = load<f32>(s)
      const e: f64 = load<f32>(s + sharesSize)
      const eLeft: f64 = load<f32>(s + sharesSize - 4)
      const so: f64 = load<f32>(s + 2 * sharesSize)
      const no: f64 = load<f32>(s + 3 * sharesSize)
      const noBelow: f64 = load<f32>(s + 3 * sharesSize - half)
      const pSE = load<f64>(m + apart)
      const pNW = load<f64>(m + 2 * apart)
      const pNE = load<f64>(m + 3 * apart)
      const pNEBelow = load<f64>(mBelow + 3 * apart)
      const E = link(c, EAST)
      const N = link(c, NORTH)
      const NE = link(c, NORTH_EAST)
      const NW = link(c, NORTH_WEST)
      // (A p_east) at the cell, above and below it, and at the odd column east of it.
      let linkEast: f64 = 0
      if (i + 1 < columns) {
        const soRight: f64 = load<f32>(s + 2 * sharesSize + 4)
        const noRightBelow: f64 = load<f32>(s + 3 * sharesSize + 4 - half)
        const oEast = link(o, EAST)
        const oNorth = link(o, NORTH)
        const oNorthWest = link(o, NORTH_WEST)
        const belowNorthEast = link(down, NORTH_EAST)
        const belowNorthWest = link(o - stride, NORTH_WEST)
        const here = E * e + NE * pSE + belowNorthWest * pNEBelow
        const above = link(up, EAST) * pSE + oNorthWest * e
        const below = link(down, EAST) * pNEBelow + belowNorthEast * e
        const beside =
          (E + belowNorthEast + oNorthWest + link(o, OWN)) * e +
          oEast * (e - 1) +
          oNorth * (e - pSE) +
          link(o - stride, NORTH) * (e - pNEBelow) +
          link(o, NORTH_EAST) * (e - soRight) +
          link(down + 4, NORTH_WEST) * (e - noRightBelow)
        linkEast = here + so * above + noBelow * below - w * beside
      }
      let linkNorth: f64 = 0
      let linkNorthEast: f64 = 0
      let linkNorthWest: f64 = 0
      if (j + 1 < rows) {
        const wUp: f64 = load<f32>(s + half)
        const eUp: f64 = load<f32>(s + sharesSize + half)
        const wLeftUp: f64 = load<f32>(s + half - 4)
        const eLeftUp: f64 = load<f32>(s + sharesSize + half - 4)
        const noRight: f64 = load<f32>(s + 3 * sharesSize + 4)
        const noLeft: f64 = load<f32>(s + 3 * sharesSize - 4)
        const oNorth = link(o, NORTH)
        const oNorthWest = link(o, NORTH_WEST)
        const lNorth = link(l, NORTH)
        const lNorthEast = link(l, NORTH_EAST)
        const upEast = link(up, EAST)
        const upWest = link(l + stride, EAST)
        const upNorthEast = link(up, NORTH_EAST)
        const upNorthWest = link(up, NORTH_WEST)
        const here = N * no + NE * pNW + NW * pNELeft
        const right = oNorth * pNW + oNorthWest * no
        const left = lNorth * pNELeft + lNorthEast * no
        const beside =
          (N + lNorthEast + oNorthWest + link(up, OWN)) * no +
          link(up, NORTH) * (no - 1) +
          upEast * (no - pNW) +
          upWest * (no - pNELeft) +
          upNorthEast * (no - wUp) +
          upNorthWest * (no - eLeftUp)
        linkNorth = here + w * right + eLeft * left - so * beside
        linkNorthEast =
          NE * pNE +
          w * (oNorth * pNE + link(o, NORTH_EAST) * noRight) +
          so * (upEast * pNE + upNorthEast * eUp)
        linkNorthWest =
          NW * pNWLeft +
          eLeft * (lNorth * pNWLeft + link(l, NORTH_WEST) * noLeft) +
          so * (upWest * pNWLeft + upNorthWest * wLeftUp)
      }
      const isHeld = anyHeld(c, j, rows)
      const at1 = cellAt(coarse, coarseStride, coarseHalf, I, J)
      store<f32>(at1 + EAST * coarseSize, <f32>linkEast)
      store<f32>(at1 + NORTH * coarseSize, <f32>linkNorth)
      store<f32>(at1 + NORTH_EAST * coarseSize, <f32>linkNorthEast)
      store<f32>(at1 + NORTH_WEST * coarseSize, <f32>linkNorthWest)
      store<f32>(at1 + OWN * coarseSize, isHeld ? <f32>heldBoth(i, j, columns, rows, w, eLeft, so, noBelow) : 0)
      pNWLeft = pNW
      pNELeft = pNE
    }
  }
}

// Is any cell held within two cells of that at c, in row j? Looks at a few more than that.
function anyHeld(c: usize, j: i32, rows: i32): bool {
  let any = f32x4.splat(0)
  for (let b = j > 0 ? -2 : 0; b <= 2; b++) {
    if (j + b >= rows) break
    const at = c + b * stride + OWN * size
    any = v128.or(any, v128.or(v128.load(at - 4), v128.load(at + half - 4)))
  }
  return v128.any_true(any)
}

// Sum of coarse cell (i, j)'s row: sum over its cells of P (A P 1), from the defects of the shares.
function heldBoth(i: i32, j: i32, columns: i32, rows: i32, w: f64, e: f64, so: f64, no: f64): f64 {
  const hasWest = i > 0
  const hasEast = i + 1 < columns
  const hasSouth = j > 0
  const hasNorth = j + 1 < rows
  const vE = hasEast ? defectAlong(i + 1, j) : 0
  const vW = hasWest ? defectAlong(i - 1, j) : 0
  const vN = hasNorth ? defectUp(i, j + 1) : 0
  const vS = hasSouth ? defectUp(i, j - 1) : 0
  const vNE = hasEast && hasNorth ? defectMiddle(i + 1, j + 1) : 0
  const vNW = hasWest && hasNorth ? defectMiddle(i - 1, j + 1) : 0
  const vSE = hasEast && hasSouth ? defectMiddle(i + 1, j - 1) : 0
  const vSW = hasWest && hasSouth ? defectMiddle(i - 1, j - 1) : 0
  let held = at(OWN, i, j)
  held += aE(i, j) * vE + aE(i - 1, j) * vW + aN(i, j) * vN + aN(i, j - 1) * vS
  held += aNE(i, j) * vNE + aNW(i, j) * vNW + aNW(i + 1, j - 1) * vSE + aNE(i - 1, j - 1) * vSW
  if (hasEast) {
    const k = i + 1
    let flow = at(OWN, k, j) * (1 - vE) - (aE(i, j) + aE(k, j)) * vE
    flow += aN(k, j) * (vNE - vE) + aN(k, j - 1) * (vSE - vE)
    flow += aNW(k, j) * (vN - vE) + aNE(i, j - 1) * (vS - vE)
    flow += aNE(k, j) * ((hasNorth && k + 1 < columns ? defectUp(k + 1, j + 1) : 0) - vE)
    flow += aNW(k + 1, j - 1) * ((hasSouth && k + 1 < columns ? defectUp(k + 1, j - 1) : 0) - vE)
    held += w * flow
  }
  if (hasWest) {
    const k = i - 1
    let flow = at(OWN, k, j) * (1 - vW) - (aE(k, j) + aE(k - 1, j)) * vW
    flow += aN(k, j) * (vNW - vW) + aN(k, j - 1) * (vSW - vW)
    flow += aNE(k, j) * (vN - vW) + aNW(i, j - 1) * (vS - vW)
    flow += aNW(k, j) * ((hasNorth ? defectUp(k - 1, j + 1) : 0) - vW)
    flow += aNE(k - 1, j - 1) * ((hasSouth ? defectUp(k - 1, j - 1) : 0) - vW)
    held += e * flow
  }
  if (hasNorth) {
    const k = j + 1
    let flow = at(OWN, i, k) * (1 - vN) - (aN(i, j) + aN(i, k)) * vN
    flow += aE(i, k) * (vNE - vN) + aE(i - 1, k) * (vNW - vN)
    flow += aNW(i + 1, j) * (vE - vN) + aNE(i - 1, j) * (vW - vN)
    flow += aNE(i, k) * ((hasEast && k + 1 < rows ? defectAlong(i + 1, k + 1) : 0) - vN)
    flow += aNW(i, k) * ((hasWest && k + 1 < rows ? defectAlong(i - 1, k + 1) : 0) - vN)
    held += so * flow
  }
  if (hasSouth) {
    const k = j - 1
    let flow = at(OWN, i, k) * (1 - vS) - (aN(i, k) + aN(i, k - 1)) * vS
    flow += aE(i, k) * (vSE - vS) + aE(i - 1, k) * (vSW - vS)
    flow += aNE(i, k) * (vE - vS) + aNW(i, k) * (vW - vS)
    flow += aNW(i + 1, k - 1) * ((hasEast ? defectAlong(i + 1, k - 1) : 0) - vS)
    flow += aNE(i - 1, k - 1) * ((hasWest ? defectAlong(i - 1, k - 1) : 0) - vS)
    held += no * flow
  }
  return held
}

// Rows from..to - 1, only every second column left out.
export function galerkinAlong(
  levelGiven: usize,
  sizeGiven: usize,
  strideGiven: usize,
  halfGiven: usize,
  columns: i32,
  rows: i32,
  shares: usize,
  sharesSize: usize,
  coarse: usize,
  coarseSize: usize,
  coarseStride: usize,
  coarseHalf: usize,
  from: i32,
  to: i32,
): void {
  hold(levelGiven, sizeGiven, strideGiven, halfGiven)
  for (let j = from; j < to; j++) {
    let s = rowAt(shares, half, j)
    for (let I = 0; 2 * I < columns; I++, s += 4) {
      const i = 2 * I
      const k = i + 1
      const w: f64 = load<f32>(s)
      const e: f64 = load<f32>(s + sharesSize)
      const wLeft: f64 = load<f32>(s - 4)
      const eLeft: f64 = load<f32>(s + sharesSize - 4)
      const wUp: f64 = load<f32>(s + half)
      const eUp: f64 = load<f32>(s + sharesSize + half)
      const wLeftUp: f64 = load<f32>(s + half - 4)
      const eLeftUp: f64 = load<f32>(s + sharesSize + half - 4)
      let linkEast: f64 = 0
      if (k < columns) {
        const away = aN(k, j) + aN(k, j - 1) + aNE(k, j) + aNW(k, j) + aNE(i, j - 1) + aNW(k + 1, j - 1)
        linkEast = aE(i, j) * e - w * ((aE(i, j) + away + at(OWN, k, j)) * e + aE(k, j) * (e - 1))
      }
      const here = aN(i, j) + aNE(i, j) * wUp + aNW(i, j) * eLeftUp
      const right = aNW(k, j) + aN(k, j) * wUp
      const left = i > 0 ? aNE(i - 1, j) + aN(i - 1, j) * eLeftUp : 0
      const linkNorth = here + w * right + eLeft * left
      const linkNorthEast = aNE(i, j) * eUp + w * (aN(k, j) * eUp + aNE(k, j))
      const linkNorthWest = i > 0 ? aNW(i, j) * wLeftUp + eLeft * (aN(i - 1, j) * wLeftUp + aNW(i - 1, j)) : 0
      let own = at(OWN, i, j) + flowAlong(i, j, columns, rows, 0)
      if (k < columns) own += w * flowAlong(k, j, columns, rows, defectAlong(k, j))
      if (i > 0) own += eLeft * flowAlong(i - 1, j, columns, rows, defectAlong(i - 1, j))
      const at1 = cellAt(coarse, coarseStride, coarseHalf, I, j)
      store<f32>(at1 + EAST * coarseSize, <f32>linkEast)
      store<f32>(at1 + NORTH * coarseSize, <f32>linkNorth)
      store<f32>(at1 + NORTH_EAST * coarseSize, <f32>linkNorthEast)
      store<f32>(at1 + NORTH_WEST * coarseSize, <f32>linkNorthWest)
      store<f32>(at1 + OWN * coarseSize, <f32>own)
    }
  }
}

function alongAt(i: i32, j: i32, columns: i32, rows: i32): f64 {
  return (i & 1) === 1 && i < columns && j >= 0 && j < rows ? defectAlong(i, j) : 0
}

// (A P 1) of cell (i, j) with defect v, less own of even columns, which the caller has.
function flowAlong(i: i32, j: i32, columns: i32, rows: i32, v: f64): f64 {
  let flow: f64 = (i & 1) === 1 ? at(OWN, i, j) * (1 - v) : 0
  flow += aE(i, j) * (alongAt(i + 1, j, columns, rows) - v) + aE(i - 1, j) * (alongAt(i - 1, j, columns, rows) - v)
  flow += aN(i, j) * (alongAt(i, j + 1, columns, rows) - v) + aN(i, j - 1) * (alongAt(i, j - 1, columns, rows) - v)
  flow +=
    aNE(i, j) * (alongAt(i + 1, j + 1, columns, rows) - v) + aNW(i, j) * (alongAt(i - 1, j + 1, columns, rows) - v)
  flow +=
    aNE(i - 1, j - 1) * (alongAt(i - 1, j - 1, columns, rows) - v) +
    aNW(i + 1, j - 1) * (alongAt(i + 1, j - 1, columns, rows) - v)
  return flow
}
