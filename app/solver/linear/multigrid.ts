import { prepareCompiled } from './compiled'
import type { Kernels } from './kernels'
import type { LinearOptions, LinearOutcome, LinearSystem, Prepared } from './system'

/**
 * One grid of the hierarchy. Arrays have a rim of one cell of zeros all around: cell (i, j) is at
 * (j + 1) * stride + i + 1, stride = columns + 2, so that neighbours need no test.
 */
interface Level {
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
interface Interpolation {
  parent: Int32Array
  share: Float64Array
}

type Axis = 'x' | 'y' | 'both'

/** A grid of at most so many cells is solved directly. */
const coarsest = 100
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

function padded(values: Float64Array, into: Float64Array, columns: number, rows: number): void {
  for (let j = 0; j < rows; j++) {
    into.set(values.subarray(j * columns, (j + 1) * columns), (j + 1) * (columns + 2) + 1)
  }
}

function finest(system: LinearSystem): Level {
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
function axisOf(level: Level): Axis {
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

function coarsened(fine: Level): Level {
  const axis = axisOf(fine)
  const columns = axis === 'y' ? fine.columns : (fine.columns + 1) >> 1
  const rows = axis === 'x' ? fine.rows : (fine.rows + 1) >> 1
  const coarse = emptyLevel(columns, rows, false)
  const [interpolation, defect] = interpolate(fine, axis, columns)
  galerkin(fine, interpolation, defect, coarse)
  invertDiagonal(coarse)
  fine.down = interpolation
  return coarse
}

/** Gauss-Seidel on every second cell of every `rowStep`-th row, beginning at (column, row). */
function relax(level: Level, column: number, row: number, rowStep: number): void {
  const { columns, rows, stride: s, east, north, northEast, northWest, inverse, x, b, fivePoint } = level
  for (let j = row; j < rows; j += rowStep) {
    const first = (j + 1) * s + 1
    for (let c = first + (rowStep === 1 ? (column + j) & 1 : column); c < first + columns; c += 2) {
      let sum =
        at(b, c) +
        at(east, c) * at(x, c + 1) +
        at(east, c - 1) * at(x, c - 1) +
        at(north, c) * at(x, c + s) +
        at(north, c - s) * at(x, c - s)
      if (!fivePoint) {
        sum +=
          at(northEast, c) * at(x, c + s + 1) +
          at(northEast, c - s - 1) * at(x, c - s - 1) +
          at(northWest, c) * at(x, c + s - 1) +
          at(northWest, c - s + 1) * at(x, c - s + 1)
      }
      x[c] = sum * at(inverse, c)
    }
  }
}

/** Red-black on five points, four colours on nine; backwards after the coarse correction. */
function smooth(level: Level, backwards: boolean): void {
  if (level.fivePoint) {
    relax(level, backwards ? 1 : 0, 0, 1)
    relax(level, backwards ? 0 : 1, 0, 1)
    return
  }
  for (let k = 0; k < 4; k++) {
    const colour = backwards ? 3 - k : k
    // (0, 0), (1, 1), (1, 0), (0, 1)
    relax(level, colour === 1 || colour === 2 ? 1 : 0, colour & 1, 2)
  }
}

/** into = b - A x, each link's flow by the difference of its ends. */
function residual(level: Level, x: Float64Array, b: Float64Array, into: Float64Array): void {
  const { columns, rows, stride: s, east, north, northEast, northWest, own, inverse, fivePoint } = level
  for (let j = 1; j <= rows; j++) {
    for (let c = j * s + 1; c <= j * s + columns; c++) {
      if (at(inverse, c) === 0) {
        into[c] = 0
        continue
      }
      const here = at(x, c)
      let sum =
        at(b, c) +
        at(east, c) * (at(x, c + 1) - here) +
        at(east, c - 1) * (at(x, c - 1) - here) +
        at(north, c) * (at(x, c + s) - here) +
        at(north, c - s) * (at(x, c - s) - here) -
        at(own, c) * here
      if (!fivePoint) {
        sum +=
          at(northEast, c) * (at(x, c + s + 1) - here) +
          at(northEast, c - s - 1) * (at(x, c - s - 1) - here) +
          at(northWest, c) * (at(x, c + s - 1) - here) +
          at(northWest, c - s + 1) * (at(x, c - s + 1) - here)
      }
      into[c] = sum
    }
  }
}

/** Dense Cholesky factor of the coarsest grid, row by row; a pivot lost to rounding leaves its cell at 0. */
function factor(level: Level): Float64Array {
  const { columns, rows, stride: s, inverse } = level
  const n = columns * rows
  const l = new Float64Array(n * n)
  function set(row: number, column: number, link: number): void {
    if (link !== 0) l[row * n + column] = -link
  }
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const c = (j + 1) * s + i + 1
      const k = j * columns + i
      l[k * n + k] = at(inverse, c) > 0 ? 1 / at(inverse, c) : 1
      set(k + 1, k, at(level.east, c))
      set(k + columns, k, at(level.north, c))
      set(k + columns + 1, k, at(level.northEast, c))
      set(k + columns - 1, k, at(level.northWest, c))
    }
  }
  for (let k = 0; k < n; k++) {
    const whole = at(l, k * n + k)
    let pivot = whole
    for (let m = 0; m < k; m++) pivot -= at(l, k * n + m) ** 2
    const root = pivot > 1e-15 * whole ? Math.sqrt(pivot) : Number.POSITIVE_INFINITY
    l[k * n + k] = root
    for (let i = k + 1; i < n; i++) {
      let value = at(l, i * n + k)
      for (let m = 0; m < k; m++) value -= at(l, i * n + m) * at(l, k * n + m)
      l[i * n + k] = root === Number.POSITIVE_INFINITY ? 0 : value / root
    }
  }
  return l
}

function solveDirectly(level: Level, l: Float64Array, y: Float64Array): void {
  const { columns, stride: s, b, x } = level
  const n = y.length
  for (let i = 0; i < n; i++) {
    let value = at(b, (Math.floor(i / columns) + 1) * s + (i % columns) + 1)
    for (let m = 0; m < i; m++) value -= at(l, i * n + m) * at(y, m)
    y[i] = value / at(l, i * n + i)
  }
  for (let i = n - 1; i >= 0; i--) {
    let value = at(y, i)
    for (let m = i + 1; m < n; m++) value -= at(l, m * n + i) * at(y, m)
    y[i] = value / at(l, i * n + i)
    x[(Math.floor(i / columns) + 1) * s + (i % columns) + 1] = at(y, i)
  }
}

function restrict(fine: Level, { parent, share }: Interpolation, coarse: Level): void {
  coarse.b.fill(0)
  for (let c = 0; c < fine.r.length; c++) {
    for (let k = 4 * c; k < 4 * c + 4; k++) {
      const id = parent[k] as number
      if (id >= 0) coarse.b[id] = at(coarse.b, id) + at(share, k) * at(fine.r, c)
    }
  }
}

function correct(fine: Level, { parent, share }: Interpolation, coarse: Level): void {
  for (let c = 0; c < fine.x.length; c++) {
    let sum = at(fine.x, c)
    for (let k = 4 * c; k < 4 * c + 4; k++) {
      const id = parent[k] as number
      if (id >= 0) sum += at(share, k) * at(coarse.x, id)
    }
    fine.x[c] = sum
  }
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let c = 0; c < a.length; c++) sum += at(a, c) * at(b, c)
  return sum
}

/**
 * Makes a system ready for `solve`: the hierarchy of grids and the factor of the coarsest. Numbers in the system are
 * copied. Nothing is thrown: a system that is not positive definite ends its solves as stalled. With `kernels` a
 * five-point system is solved by compiled arithmetic (compiled.ts), in the same way; it takes over the memory of
 * `before`, which must not be used any more.
 */
export function prepareMultigrid(system: LinearSystem, kernels?: Kernels, before?: Prepared): Prepared {
  if (kernels && !system.northEast && !system.northWest) return prepareCompiled(system, kernels, before)
  const levels = [finest(system)]
  let last = levels[0] as Level
  while (last.columns * last.rows > coarsest) {
    last = coarsened(last)
    levels.push(last)
  }
  const l = factor(last)
  const y = new Float64Array(last.columns * last.rows)
  const fine = levels[0] as Level
  const { columns, rows } = system
  const n = fine.own.length
  const zero = new Float64Array(n)

  /** x of level k from its b; twice over from the third level on, where it costs little. */
  function cycle(k: number, again: boolean): void {
    const level = levels[k] as Level
    const coarse = levels[k + 1]
    if (!coarse || !level.down) {
      solveDirectly(level, l, y)
      return
    }
    if (!again) level.x.fill(0)
    smooth(level, false)
    residual(level, level.x, level.b, level.r)
    restrict(level, level.down, coarse)
    cycle(k + 1, false)
    if (k >= 2 && coarse.down) cycle(k + 1, true)
    correct(level, level.down, coarse)
    smooth(level, true)
  }

  function padIn(values: Float64Array, into: Float64Array): void {
    padded(values, into, columns, rows)
    for (let c = 0; c < n; c++) if (at(fine.inverse, c) === 0) into[c] = 0
  }

  function precondition(r: Float64Array, z: Float64Array): void {
    padIn(r, fine.b)
    cycle(0, false)
    for (let j = 0; j < rows; j++) {
      z.set(fine.x.subarray((j + 1) * fine.stride + 1, (j + 1) * fine.stride + 1 + columns), j * columns)
    }
  }

  /** Size that rounding alone gives the residual at x. */
  function roundingFloor(x: Float64Array, b: Float64Array): number {
    let sum = 0
    for (let c = 0; c < n; c++) {
      const unit = at(fine.inverse, c)
      if (unit > 0) sum += (at(x, c) / unit) ** 2 + at(b, c) ** 2
    }
    return Number.EPSILON * Math.sqrt(sum)
  }

  function solve(given: Float64Array, start: Float64Array, options: LinearOptions): LinearOutcome {
    const b = new Float64Array(n)
    const x = new Float64Array(n)
    const r = new Float64Array(n)
    const p = new Float64Array(n)
    const q = new Float64Array(n)
    padIn(given, b)
    padIn(start, x)
    if (dot(b, b) === 0) x.fill(0)
    let ended: LinearOutcome['ended'] = 'iterations'
    let iterations = 0
    let error = 0
    residual(fine, x, b, r)
    let norm = Math.sqrt(dot(r, r))
    let best = norm
    let idle = 0
    let old = 0
    if (norm <= options.target) ended = 'converged'
    while (ended === 'iterations' && iterations < options.mostIterations) {
      fine.b.set(r)
      cycle(0, false)
      const z = fine.x
      const now = dot(r, z)
      if (!(now > 0)) {
        ended = 'stalled'
        break
      }
      const beta = old > 0 ? now / old : 0
      old = now
      for (let c = 0; c < n; c++) p[c] = at(z, c) + beta * at(p, c)
      residual(fine, p, zero, q)
      const alpha = -now / dot(p, q)
      if (!(alpha > 0 && Number.isFinite(alpha))) {
        ended = 'stalled'
        break
      }
      error = 0
      for (let c = 0; c < n; c++) {
        const change = alpha * at(p, c)
        if (Math.abs(change) > error) error = Math.abs(change)
        x[c] = at(x, c) + change
        r[c] = at(r, c) + alpha * at(q, c)
      }
      iterations++
      norm = Math.sqrt(dot(r, r))
      if (norm <= options.target) {
        // The recurrence drifts away from the truth by rounding: the true residual decides, and is gone on from.
        residual(fine, x, b, r)
        norm = Math.sqrt(dot(r, r))
        if (norm <= options.target) ended = 'converged'
        else old = 0
      }
      if (options.watch?.(iterations, norm)) ended = 'cancelled'
      if (ended !== 'iterations') break
      if (norm < 0.9 * best) {
        best = norm
        idle = 0
      } else idle++
      if (norm <= roundingFloor(x, b) || idle >= 12) {
        residual(fine, x, b, r)
        norm = Math.sqrt(dot(r, r))
        if (norm <= options.target) ended = 'converged'
        else if (norm <= 4 * roundingFloor(x, b) || idle >= 12) ended = 'stalled'
        else old = 0
      }
    }
    residual(fine, x, b, r)
    norm = Math.sqrt(dot(r, r))
    for (let j = 0; j < rows; j++) {
      for (let i = 0; i < columns; i++) {
        const c = (j + 1) * fine.stride + i + 1
        if (at(fine.inverse, c) > 0) start[j * columns + i] = at(x, c)
      }
    }
    return { iterations, residual: norm, ended, error }
  }

  let bytes = 8 * l.length
  for (const level of levels) bytes += level.own.length * (9 * 8 + (level.down ? 4 * (8 + 4) : 0))
  return { solve, precondition, bytes }
}
