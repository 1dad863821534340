import { BLACK_OWN, EAST, NORTH, RED_OWN, SOUTH, WEST, doubleRow } from './colours'
import {
  EAST as LINK_EAST,
  NORTH as LINK_NORTH,
  NORTH_EAST,
  NORTH_WEST,
  OWN,
  cellAt,
  rowAt,
} from './layout'

// From the five-point level to the next: interpolation by the operator (Alcouffe et al. 1981; Dendy 1982) and the
// Galerkin matrix A_c = P' A P, in double precision, stored in single. With p_K the interpolated unit value of coarse
// cell K, the link of C to K is -p_C' A p_K and the row's sum p_C' A P 1, each from differences: where nothing is held
// nearby P 1 = 1 and the sum is exactly 0. The cell in the middle of four satisfies its own equation, (A P)_middle = 0.

// @ts-ignore: decorator
@inline
function at(c: usize, array: usize, two: usize): f64 {
  return load<f64>(c + array * two)
}

// Shares of the black cell east of red cell c and north of it: west and east, south and north; and what is held back.
// @ts-ignore: decorator
@inline
function eastSum(c: usize, two: usize): f64 {
  return at(c, EAST, two) + at(c + 8, WEST, two) + at(c, BLACK_OWN, two)
}

// @ts-ignore: decorator
@inline
function northSum(c: usize, two: usize, row2: usize): f64 {
  return at(c, NORTH, two) + at(c + 2 * row2, SOUTH, two) + at(c + row2, BLACK_OWN, two)
}

// @ts-ignore: decorator
@inline
function part(value: f64, sum: f64): f64 {
  return sum > 0 ? value / sum : 0
}

// Shares of the middle cells of fine rows 2 J + 1, J from..to - 1: of their south-western, south-eastern, north-western
// and north-eastern coarse cells.
export function sharesRedBoth(
  size: usize,
  stride: usize,
  double: usize,
  columns: i32,
  rows: i32,
  shares: usize,
  sharesSize: usize,
  from: i32,
  to: i32,
): void {
  const two = 2 * size
  const row2 = 2 * stride
  for (let J = from; J < to; J++) {
    if (2 * J + 1 >= rows) return
    let c = doubleRow(double, stride, 2 * J)
    let s = rowAt(shares, stride, J)
    for (let i = 1; i < columns; i += 2, c += 8, s += 4) {
      const z = c + row2
      const w = at(z, WEST, two)
      const e = at(z, EAST, two)
      const b = at(z, SOUTH, two)
      const a = at(z, NORTH, two)
      const diagonal = w + e + b + a + at(z, RED_OWN, two)
      const unit = part(1, diagonal)
      const left = unit * w * part(1, northSum(c, two, row2))
      const right = unit * e * part(1, northSum(c + 8, two, row2))
      const below = unit * b * part(1, eastSum(c, two))
      const above = unit * a * part(1, eastSum(c + 2 * row2, two))
      const up = c + 2 * row2
      store<f32>(s, <f32>(left * at(c, NORTH, two) + below * at(c, EAST, two)))
      store<f32>(s + sharesSize, <f32>(right * at(c + 8, NORTH, two) + below * at(c + 8, WEST, two)))
      store<f32>(s + 2 * sharesSize, <f32>(left * at(up, SOUTH, two) + above * at(up, EAST, two)))
      store<f32>(s + 3 * sharesSize, <f32>(right * at(up + 8, SOUTH, two) + above * at(up + 8, WEST, two)))
    }
  }
}

// What the middle cell at z, in the north-east of red cell c, holds back of a level of 1 all around.
function middleDefect(c: usize, two: usize, row2: usize): f64 {
  const z = c + row2
  const w = at(z, WEST, two)
  const e = at(z, EAST, two)
  const b = at(z, SOUTH, two)
  const a = at(z, NORTH, two)
  const own = at(z, RED_OWN, two)
  const left = w * part(at(c + row2, BLACK_OWN, two), northSum(c, two, row2))
  const right = e * part(at(c + row2 + 8, BLACK_OWN, two), northSum(c + 8, two, row2))
  const below = b * part(at(c, BLACK_OWN, two), eastSum(c, two))
  const above = a * part(at(c + 2 * row2, BLACK_OWN, two), eastSum(c + 2 * row2, two))
  return part(own + left + right + below + above, w + e + b + a + own)
}

// Two neighbouring numbers.
// @ts-ignore: decorator
@inline
function pair(c: usize, array: usize, two: usize): v128 {
  return v128.load(c + array * two)
}

// @ts-ignore: decorator
@inline
function inverse(sum: v128): v128 {
  return v128.and(f64x2.div(f64x2.splat(1), sum), f64x2.gt(sum, f64x2.splat(0)))
}

// @ts-ignore: decorator
@inline
function plus(a: v128, b: v128): v128 {
  return f64x2.add(a, b)
}

// @ts-ignore: decorator
@inline
function times(a: v128, b: v128): v128 {
  return f64x2.mul(a, b)
}

// @ts-ignore: decorator
@inline
function eastSums(c: usize, two: usize): v128 {
  return plus(plus(pair(c, EAST, two), pair(c + 8, WEST, two)), pair(c, BLACK_OWN, two))
}

// @ts-ignore: decorator
@inline
function northSums(c: usize, two: usize, row2: usize): v128 {
  return plus(plus(pair(c, NORTH, two), pair(c + 2 * row2, SOUTH, two)), pair(c + row2, BLACK_OWN, two))
}

// Two neighbouring shares.
// @ts-ignore: decorator
@inline
function sharesAt(s: usize): v128 {
  return f64x2.promote_low_f32x4(v128.load64_zero(s))
}

// The first of two neighbours goes to the even columns, the second to the odd ones.
// @ts-ignore: decorator
@inline
function storeSplit(to: usize, half: usize, values: v128): void {
  const singles = f32x4.demote_f64x2_zero(values)
  v128.store32_lane(to, singles, 0)
  v128.store32_lane(to + half, singles, 1)
}

// Two coarse cells at a time; one past the last is zeros on zeros.
export function galerkinRedBoth(
  size: usize,
  stride: usize,
  double: usize,
  columns: i32,
  shares: usize,
  sharesSize: usize,
  coarse: usize,
  coarseSize: usize,
  coarseStride: usize,
  coarseHalf: usize,
  from: i32,
  to: i32,
): void {
  const two = 2 * size
  const row2 = 2 * stride
  const one = f64x2.splat(1)
  for (let J = from; J < to; J++) {
    let c = doubleRow(double, stride, 2 * J)
    let s = rowAt(shares, stride, J)
    let into = rowAt(coarse, coarseStride, J)
    for (let I = 0; 2 * I < columns; I += 2, c += 16, s += 8, into += 4) {
      const up = c + 2 * row2
      const down = c - 2 * row2
      const z = c + row2
      const aE = pair(c, EAST, two)
      const aN = pair(c, NORTH, two)
      const eastUnit = inverse(eastSums(c, two))
      const northUnit = inverse(northSums(c, two, row2))
      // Shares that C has in the four black cells beside it, and that its neighbours have there.
      const w = times(aE, eastUnit)
      const e = times(pair(c + 8, WEST, two), eastUnit)
      const so = times(aN, northUnit)
      const no = times(pair(up, SOUTH, two), northUnit)
      const wLeft = times(pair(c, WEST, two), inverse(eastSums(c - 8, two)))
      const soBelow = times(pair(c, SOUTH, two), inverse(northSums(down, two, row2)))
      const pSE = sharesAt(s + sharesSize)
      const pNW = sharesAt(s + 2 * sharesSize)
      const pNE = sharesAt(s + 3 * sharesSize)
      const pNEBelow = sharesAt(s + 3 * sharesSize - stride)
      const pNELeft = sharesAt(s + 3 * sharesSize - 4)
      const pNWLeft = sharesAt(s + 2 * sharesSize - 4)
      const zW = pair(z, WEST, two)
      const zS = pair(z, SOUTH, two)
      const leftE = pair(z - 8, EAST, two)
      const leftS = pair(z - 8, SOUTH, two)
      const belowN = pair(c - row2, NORTH, two)
      const belowW = pair(c - row2, WEST, two)
      const aEe = times(aE, e)
      const aNno = times(aN, no)
      let atEast = plus(aEe, times(pair(c + 8, WEST, two), f64x2.sub(e, one)))
      atEast = plus(atEast, times(zS, f64x2.sub(e, pSE)))
      atEast = plus(atEast, times(belowN, f64x2.sub(e, pNEBelow)))
      atEast = plus(atEast, times(pair(c, BLACK_OWN, two), e))
      let atNorth = plus(aNno, times(pair(up, SOUTH, two), f64x2.sub(no, one)))
      atNorth = plus(atNorth, times(zW, f64x2.sub(no, pNW)))
      atNorth = plus(atNorth, times(leftE, f64x2.sub(no, pNELeft)))
      atNorth = plus(atNorth, times(pair(z, BLACK_OWN, two), no))
      const beside = plus(times(so, times(zW, pSE)), times(soBelow, times(belowW, pNEBelow)))
      const linkEast = f64x2.sub(plus(aEe, beside), times(w, atEast))
      const above = plus(times(w, times(zS, pNW)), times(wLeft, times(leftS, pNELeft)))
      const linkNorth = f64x2.sub(plus(aNno, above), times(so, atNorth))
      const linkNorthEast = times(plus(times(w, zS), times(so, zW)), pNE)
      const linkNorthWest = times(plus(times(wLeft, leftS), times(so, leftE)), pNWLeft)
      storeSplit(into + LINK_EAST * coarseSize, coarseHalf, linkEast)
      storeSplit(into + LINK_NORTH * coarseSize, coarseHalf, linkNorth)
      storeSplit(into + NORTH_EAST * coarseSize, coarseHalf, linkNorthEast)
      storeSplit(into + NORTH_WEST * coarseSize, coarseHalf, linkNorthWest)
      const own = pair(c, RED_OWN, two)
      const at1 = into + OWN * coarseSize
      storeSplit(at1, coarseHalf, own)
      if (!anyHeld(c, two, row2, J)) continue
      store<f32>(at1, <f32>(f64x2.extract_lane(own, 0) + heldAround(c, two, row2, J)))
      store<f32>(at1 + coarseHalf, <f32>(f64x2.extract_lane(own, 1) + heldAround(c + 8, two, row2, J)))
    }
  }
}

// Is anything held around the two coarse cells at c, but for these themselves? Looks at no fewer than that needs.
function anyHeld(c: usize, two: usize, row2: usize, J: i32): bool {
  let any = v128.or(around(c, BLACK_OWN, two), around(c + row2, BLACK_OWN, two))
  any = v128.or(any, around(c - row2, BLACK_OWN, two))
  any = v128.or(any, around(c + 2 * row2, BLACK_OWN, two))
  if (J > 0) any = v128.or(any, around(c - 2 * row2, BLACK_OWN, two))
  any = v128.or(any, v128.or(around(c + row2, RED_OWN, two), around(c - row2, RED_OWN, two)))
  return v128.any_true(any)
}

// @ts-ignore: decorator
@inline
function around(c: usize, array: usize, two: usize): v128 {
  return v128.or(pair(c - 8, array, two), pair(c + 8, array, two))
}

// What the shares hold back around the coarse cell at c: its row's sum of A P 1 less its own.
function heldAround(c: usize, two: usize, row2: usize, J: i32): f64 {
  const down = c - 2 * row2
  const z = c + row2
  const aW = at(c, WEST, two)
  const aE = at(c, EAST, two)
  const aS = at(c, SOUTH, two)
  const aN = at(c, NORTH, two)
  const eastUnit = part(1, eastSum(c, two))
  const westUnit = part(1, eastSum(c - 8, two))
  const northUnit = part(1, northSum(c, two, row2))
  const southUnit = part(1, northSum(down, two, row2))
  const vE = at(c, BLACK_OWN, two) * eastUnit
  const vW = at(c - 8, BLACK_OWN, two) * westUnit
  const vN = at(z, BLACK_OWN, two) * northUnit
  const vS = at(c - row2, BLACK_OWN, two) * southUnit
  const vNE = middleDefect(c, two, row2)
  const vNW = middleDefect(c - 8, two, row2)
  const vSE = J > 0 ? middleDefect(down, two, row2) : 0
  const vSW = J > 0 ? middleDefect(down - 8, two, row2) : 0
  let held = aE * vE + aW * vW + aN * vN + aS * vS
  held += aE * eastUnit * (at(z, SOUTH, two) * (vNE - vE) + at(c - row2, NORTH, two) * (vSE - vE))
  held += aW * westUnit * (at(z - 8, SOUTH, two) * (vNW - vW) + at(c - row2 - 8, NORTH, two) * (vSW - vW))
  held += aN * northUnit * (at(z, WEST, two) * (vNE - vN) + at(z - 8, EAST, two) * (vNW - vN))
  held += aS * southUnit * (at(c - row2, WEST, two) * (vSE - vS) + at(c - row2 - 8, EAST, two) * (vSW - vS))
  return held
}

// Only every second column left out. Of row j: links of the odd column east of coarse column I to either side, what it
// and the coarse cell hold, and their links to row j + 1. In even rows the coarse cell is red, in odd rows the other.
// @ts-ignore: decorator
@inline
function leftLink(c: usize, two: usize, j: i32): f64 {
  return at(c, j & 1 ? WEST : EAST, two)
}

// @ts-ignore: decorator
@inline
function rightLink(c: usize, two: usize, j: i32): f64 {
  return j & 1 ? at(c, EAST, two) : at(c + 8, WEST, two)
}

// @ts-ignore: decorator
@inline
function heldBetween(c: usize, two: usize, j: i32): f64 {
  return at(c, j & 1 ? RED_OWN : BLACK_OWN, two)
}

// @ts-ignore: decorator
@inline
function upBetween(c: usize, two: usize, row2: usize, j: i32): f64 {
  return j & 1 ? at(c, NORTH, two) : at(c + row2, SOUTH, two)
}

// @ts-ignore: decorator
@inline
function upCoarse(c: usize, two: usize, row2: usize, j: i32): f64 {
  return j & 1 ? at(c + row2, SOUTH, two) : at(c, NORTH, two)
}

export function galerkinRedAlong(
  size: usize,
  stride: usize,
  double: usize,
  columns: i32,
  shares: usize,
  sharesSize: usize,
  coarse: usize,
  coarseSize: usize,
  coarseStride: usize,
  coarseHalf: usize,
  from: i32,
  to: i32,
): void {
  const two = 2 * size
  const row2 = 2 * stride
  for (let j = from; j < to; j++) {
    let c = doubleRow(double, stride, j)
    // West of the first column there is nothing.
    let wLeft: f64 = 0
    let eLeft: f64 = 0
    let wLeftUp: f64 = 0
    let eLeftUp: f64 = 0
    let upLeft: f64 = 0
    let fromLeft: f64 = 0
    for (let I = 0; 2 * I < columns; I++, c += 8) {
      const left = leftLink(c, two, j)
      const right = rightLink(c, two, j)
      const held = heldBetween(c, two, j)
      const unit = part(1, left + right + held)
      const w = left * unit
      const e = right * unit
      const v = held * unit
      const leftUp = leftLink(c + row2, two, j + 1)
      const rightUp = rightLink(c + row2, two, j + 1)
      const heldUp = heldBetween(c + row2, two, j + 1)
      const unitUp = part(1, leftUp + rightUp + heldUp)
      const wUp = leftUp * unitUp
      const eUp = rightUp * unitUp
      const up = upBetween(c, two, row2, j)
      let down: f64 = 0
      let vDown: f64 = 0
      if (j > 0) {
        down = upBetween(c - row2, two, row2, j - 1)
        const heldDown = heldBetween(c - row2, two, j - 1)
        vDown = part(heldDown, leftLink(c - row2, two, j - 1) + rightLink(c - row2, two, j - 1) + heldDown)
      }
      const across = up * (heldUp * unitUp - v) + down * (vDown - v)
      const linkEast = left * e - (up + down) * w * e
      const linkNorth = upCoarse(c, two, row2, j) + up * w * wUp + upLeft * eLeft * eLeftUp
      const linkNorthEast = up * w * eUp
      const linkNorthWest = upLeft * eLeft * wLeftUp
      const own = at(c, j & 1 ? BLACK_OWN : RED_OWN, two) + left * v + w * across + fromLeft
      const at1 = cellAt(coarse, coarseStride, coarseHalf, I, j)
      store<f32>(at1 + LINK_EAST * coarseSize, <f32>linkEast)
      store<f32>(at1 + LINK_NORTH * coarseSize, <f32>linkNorth)
      store<f32>(at1 + NORTH_EAST * coarseSize, <f32>linkNorthEast)
      store<f32>(at1 + NORTH_WEST * coarseSize, <f32>linkNorthWest)
      store<f32>(at1 + OWN * coarseSize, <f32>own)
      if (j & 1) {
        const s = rowAt(shares, stride, j >> 1) + (<usize>I << 2)
        store<f32>(s, <f32>w)
        store<f32>(s + sharesSize, <f32>e)
      }
      fromLeft = right * v + e * across
      wLeft = w
      eLeft = e
      wLeftUp = wUp
      eLeftUp = eUp
      upLeft = up
    }
  }
}
