import type { LinearSystem } from './system'

/**
 * One grid of the hierarchy. Arrays have a rim of one cell of zeros all around: cell (i, j) is at
 * (j + 1) * stride + i + 1, stride = columns + 2, so that neighbours need no test.
 */
export interface Level {
  columns: number
  rows: number
  stride: number
  east: Float64Array
  north: Float64Array
  northEast: Float64Array
  northWest: Float64Array
  /** What is left of the diagonal without the links, never formed as their difference. */
  own: Float64Array
  /** 1 / diagonal; 0 where there is no equation. */
  inverse: Float64Array
  fivePoint: boolean
  x: Float64Array
  b: Float64Array
  r: Float64Array
  down: Interpolation | null
}

/** From a coarser grid: cell c takes the sum over k < 4 of share[4 c + k] x_coarse[parent[4 c + k]]. */
export interface Interpolation {
  parent: Int32Array
  share: Float64Array
}

export type Axis = 'x' | 'y' | 'both'

/** A grid of at most so many cells is solved directly. */
export const coarsest = 100
/** Links stronger than the other direction's by this factor (geometric mean): coarsen along them alone. */
const leaning = 2

function emptyLevel(columns: number, rows: number, fivePoint: boolean): Level {
  const n = (columns + 2) * (rows + 2)
  const numbers = () => new Float64Array(n)
  return {
    columns,
    rows,
    stride: columns + 2,
    east: numbers(),
    north: numbers(),
    northEast: numbers(),
    northWest: numbers(),
    own: numbers(),
    inverse: numbers(),
    fivePoint,
    x: numbers(),
    b: numbers(),
    r: numbers(),
    down: null,
  }
}

export function padded(values: Float64Array, into: Float64Array, columns: number, rows: number): void {
  for (let j = 0; j < rows; j++) {
    into.set(values.subarray(j * columns, (j + 1) * columns), (j + 1) * (columns + 2) + 1)
  }
}

export function finest(system: LinearSystem): Level {
  const { columns, rows } = system
  const level = emptyLevel(columns, rows, !system.northEast && !system.northWest)
  padded(system.east, level.east, columns, rows)
  padded(system.north, level.north, columns, rows)
  if (system.northEast) padded(system.northEast, level.northEast, columns, rows)
  if (system.northWest) padded(system.northWest, level.northWest, columns, rows)
  padded(system.own, level.own, columns, rows)
  invertDiagonal(level)
  return level
}

function at(values: Float64Array, c: number): number {
  return values[c] as number
}

function diagonal(level: Level, c: number): number {
  const { stride: s, east, north, northEast, northWest, own } = level
  return (
    at(own, c) +
    at(east, c) +
    at(east, c - 1) +
    at(north, c) +
    at(north, c - s) +
    at(northEast, c) +
    at(northEast, c - s - 1) +
    at(northWest, c) +
    at(northWest, c - s + 1)
  )
}

function invertDiagonal(level: Level): void {
  for (let j = 1; j <= level.rows; j++) {
    for (let c = j * level.stride + 1; c <= j * level.stride + level.columns; c++) {
      const d = diagonal(level, c)
      level.inverse[c] = d > 0 ? 1 / d : 0
    }
  }
}

/** Geometric mean of how much stronger links along x are than along y, corner links counted half to each. */
function lean(level: Level): number {
  const { stride: s, east, north, northEast, northWest } = level
  let sum = 0
  let count = 0
  for (let j = 1; j < level.rows; j++) {
    for (let i = 1; i < level.columns; i++) {
      const c = j * s + i
      const across = at(northEast, c) + at(northWest, c + 1)
      const alongX = at(east, c) + 0.5 * (across + at(northEast, c - s) + at(northWest, c - s + 1))
      const alongY = at(north, c) + 0.5 * (across + at(northEast, c - 1) + at(northWest, c))
      if (alongX > 0 && alongY > 0) {
        sum += Math.log(alongX / alongY)
        count++
      }
    }
  }
  return count > 0 ? Math.exp(sum / count) : 1
}

/** Which way to coarsen: both ways, or only along the links that relaxation cannot do without. */
export function axisOf(level: Level): Axis {
  if (level.rows === 1) return 'x'
  if (level.columns === 1) return 'y'
  const ratio = lean(level)
  if (ratio > leaning && level.columns > 2) return 'x'
  if (ratio < 1 / leaning && level.rows > 2) return 'y'
  return 'both'
}

/**
 * Interpolation by the operator itself (Alcouffe et al. 1981; Dendy 1982): between two coarse cells by the links to
 * either side, the equation's other direction summed into them; in the middle of four by the whole equation. `defect`
 * is 1 minus the shares' sum, without cancellation: 0 wherever nothing is held nearby.
 */
function interpolate(level: Level, axis: Axis, coarseColumns: number): [Interpolation, Float64Array] {
  const { columns, rows, stride: s, east, north, northEast, northWest, own, inverse } = level
  const parent = new Int32Array(4 * own.length).fill(-1)
  const share = new Float64Array(4 * own.length)
  const defect = new Float64Array(own.length)
  const acrossX = axis !== 'y'
  const acrossY = axis !== 'x'
  function coarse(i: number, j: number): number {
    return ((acrossY ? j >> 1 : j) + 1) * (coarseColumns + 2) + (acrossX ? i >> 1 : i) + 1
  }
  function give(c: number, k: number, i: number, j: number, value: number): void {
    if (i >= columns || j >= rows || value === 0) return
    parent[4 * c + k] = coarse(i, j)
    share[4 * c + k] = value
  }
  function between(c: number, low: number, high: number): [number, number] {
    // A negative sum of links counts nothing; when neither side has a positive one, their sizes count.
    const a = low > 0 ? low : high > 0 ? 0 : -low
    const b = high > 0 ? high : low > 0 ? 0 : -high
    const held = Math.max(at(own, c), 0)
    const sum = a + b + held
    defect[c] = sum > 0 ? held / sum : 1
    return sum > 0 ? [a / sum, b / sum] : [0, 0]
  }
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const c = (j + 1) * s + i + 1
      const odd = acrossX && (i & 1) === 1
      const high = acrossY && (j & 1) === 1
      if (odd && high) continue
      if (at(inverse, c) === 0) {
        defect[c] = 1
      } else if (odd) {
        const [w, e] = between(
          c,
          at(east, c - 1) + at(northEast, c - s - 1) + at(northWest, c),
          at(east, c) + at(northWest, c - s + 1) + at(northEast, c),
        )
        give(c, 0, i - 1, j, w)
        give(c, 1, i + 1, j, e)
      } else if (high) {
        const [below, above] = between(
          c,
          at(north, c - s) + at(northEast, c - s - 1) + at(northWest, c - s + 1),
          at(north, c) + at(northWest, c) + at(northEast, c),
        )
        give(c, 0, i, j - 1, below)
        give(c, 1, i, j + 1, above)
      } else {
        give(c, 0, i, j, 1)
      }
    }
  }
  if (axis !== 'both') return [{ parent, share }, defect]
  for (let j = 1; j < rows; j += 2) {
    for (let i = 1; i < columns; i += 2) {
      const c = (j + 1) * s + i + 1
      const unit = at(inverse, c)
      if (unit === 0) {
        defect[c] = 1
        continue
      }
      const [w, e, b, a] = [at(east, c - 1), at(east, c), at(north, c - s), at(north, c)]
      const [west, easterly, below, above] = [4 * (c - 1), 4 * (c + 1), 4 * (c - s), 4 * (c + s)]
      give(c, 0, i - 1, j - 1, unit * (at(northEast, c - s - 1) + w * at(share, west) + b * at(share, below)))
      give(
        c,
        1,
        i + 1,
        j - 1,
        unit * (at(northWest, c - s + 1) + e * at(share, easterly) + b * at(share, below + 1)),
      )
      give(c, 2, i - 1, j + 1, unit * (at(northWest, c) + w * at(share, west + 1) + a * at(share, above)))
      give(
        c,
        3,
        i + 1,
        j + 1,
        unit * (at(northEast, c) + e * at(share, easterly + 1) + a * at(share, above + 1)),
      )
      defect[c] =
        unit *
        (at(own, c) +
          w * at(defect, c - 1) +
          e * at(defect, c + 1) +
          b * at(defect, c - s) +
          a * at(defect, c + s))
    }
  }
  return [{ parent, share }, defect]
}

/**
 * Galerkin product, link by link: a (x_c - x_o)^2 with both ends interpolated becomes a (sum g_k X_k)^2, which is
 * links -a g_k g_l and own a g_k (sum g). The sum of g is the difference of the defects, so that the part of the
 * diagonal that holds the level keeps all its digits.
 */
function galerkin(fine: Level, interpolation: Interpolation, defect: Float64Array, coarse: Level): void {
  const { parent, share } = interpolation
  const ids = new Int32Array(8)
  const g = new Float64Array(8)
  const s = coarse.stride
  function gather(c: number, sign: number, filled: number): number {
    let count = filled
    for (let k = 4 * c; k < 4 * c + 4; k++) {
      const id = parent[k] as number
      if (id < 0) continue
      let slot = 0
      while (slot < count && ids[slot] !== id) slot++
      if (slot === count) {
        ids[slot] = id
        g[slot] = 0
        count++
      }
      g[slot] = at(g, slot) + sign * at(share, k)
    }
    return count
  }
  function spread(count: number, weight: number, sum: number): void {
    for (let u = 0; u < count; u++) {
      const a = ids[u] as number
      coarse.own[a] = at(coarse.own, a) + weight * at(g, u) * sum
      for (let v = 0; v < u; v++) {
        const b = ids[v] as number
        const low = Math.min(a, b)
        const step = Math.max(a, b) - low
        const links =
          step === 1
            ? coarse.east
            : step === s
              ? coarse.north
              : step === s + 1
                ? coarse.northEast
                : coarse.northWest
        links[low] = at(links, low) - weight * at(g, u) * at(g, v)
      }
    }
  }
  const steps: [Float64Array, number][] = [
    [fine.east, 1],
    [fine.north, fine.stride],
    [fine.northEast, fine.stride + 1],
    [fine.northWest, fine.stride - 1],
  ]
  for (let j = 1; j <= fine.rows; j++) {
    for (let c = j * fine.stride + 1; c <= j * fine.stride + fine.columns; c++) {
      if (at(fine.own, c) !== 0) spread(gather(c, 1, 0), at(fine.own, c), 1 - at(defect, c))
      for (const [links, step] of steps) {
        const weight = at(links, c)
        if (weight === 0) continue
        spread(gather(c + step, -1, gather(c, 1, 0)), weight, at(defect, c + step) - at(defect, c))
      }
    }
  }
}

/** The next coarser grid, with the way between the two put into the finer one. */
export function coarsened(fine: Level, axis: Axis): Level {
  const columns = axis === 'y' ? fine.columns : (fine.columns + 1) >> 1
  const rows = axis === 'x' ? fine.rows : (fine.rows + 1) >> 1
  const coarse = emptyLevel(columns, rows, false)
  const [interpolation, defect] = interpolate(fine, axis, columns)
  galerkin(fine, interpolation, defect, coarse)
  invertDiagonal(coarse)
  fine.down = interpolation
  return coarse
}
