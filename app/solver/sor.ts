import { solveDense } from './dense'
import type { CornerMatrix, Matrix } from './flow'
import type { Zones } from './zones'

/**
 * One sweep of red-black successive over-relaxation over a five-point system with unit diagonal:
 *
 *   x_c <- x_c + omega (b_c + w_c x_west + e_c x_east + s_c x_south + n_c x_north - x_c)
 *
 * first on the cells with i + j even, then on those with i + j odd (Young 1954; Hageman & Young 1981, chapter 9). Cell
 * c = j nx + i; `x` has nx zeros before the first and after the last cell, so neighbours need no test: coefficients
 * across an edge, to cells without ground and to held cells are zero. Changes `x` in place, allocates nothing.
 */
export function sweep(
  x: Float64Array,
  b: Float64Array,
  w: Float64Array,
  e: Float64Array,
  s: Float64Array,
  n: Float64Array,
  nx: number,
  ny: number,
  omega: number,
): void {
  for (let colour = 0; colour < 2; colour++) {
    for (let j = 0; j < ny; j++) {
      const end = (j + 1) * nx
      for (let c = j * nx + ((j + colour) & 1); c < end; c += 2) {
        const p = c + nx
        const old = x[p] as number
        x[p] =
          old +
          omega *
            ((b[c] as number) +
              (w[c] as number) * (x[p - 1] as number) +
              (e[c] as number) * (x[p + 1] as number) +
              (s[c] as number) * (x[p - nx] as number) +
              (n[c] as number) * (x[p + nx] as number) -
              old)
      }
    }
  }
}

/**
 * The same for a system with links to corner cells too: one sweep over its nine points, in four colours (column and row
 * even or odd), so that no two cells of a colour are linked. Gauss-Seidel sweeps with any factor between 0 and 2
 * converge for symmetric positive definite systems (Ostrowski 1954), links of either sign included. `x` has nx zeros
 * before the first and nx + 1 after the last cell.
 */
export function sweepNine(
  x: Float64Array,
  b: Float64Array,
  w: Float64Array,
  e: Float64Array,
  s: Float64Array,
  n: Float64Array,
  corners: CornerMatrix,
  nx: number,
  ny: number,
  omega: number,
): void {
  const { southWest: sw, southEast: se, northWest: nw, northEast: ne } = corners
  for (let colour = 0; colour < 4; colour++) {
    for (let j = colour >> 1; j < ny; j += 2) {
      const end = (j + 1) * nx
      for (let c = j * nx + (colour & 1); c < end; c += 2) {
        const p = c + nx
        const old = x[p] as number
        x[p] =
          old +
          omega *
            ((b[c] as number) +
              (w[c] as number) * (x[p - 1] as number) +
              (e[c] as number) * (x[p + 1] as number) +
              (s[c] as number) * (x[p - nx] as number) +
              (n[c] as number) * (x[p + nx] as number) +
              (c > 0 ? (sw[c] as number) * (x[p - nx - 1] as number) : 0) +
              (se[c] as number) * (x[p - nx + 1] as number) +
              (nw[c] as number) * (x[p + nx - 1] as number) +
              (ne[c] as number) * (x[p + nx + 1] as number) -
              old)
      }
    }
  }
}

function cornerSum(corners: CornerMatrix, x: Float64Array, c: number, nx: number): number {
  const p = c + nx
  return (
    (c > 0 ? (corners.southWest[c] as number) * (x[p - nx - 1] as number) : 0) +
    (corners.southEast[c] as number) * (x[p - nx + 1] as number) +
    (corners.northWest[c] as number) * (x[p + nx - 1] as number) +
    (corners.northEast[c] as number) * (x[p + nx + 1] as number)
  )
}

export interface SorSystem {
  nx: number
  ny: number
  /** Right-hand side and coefficients scaled to a unit diagonal, symmetrically: a_ij / root(d_i d_j). */
  b: Float64Array
  w: Float64Array
  e: Float64Array
  s: Float64Array
  n: Float64Array
  /** Coefficients to corner cells; null: five points. */
  corners: CornerMatrix | null
  /** Root of the diagonal. */
  root: Float64Array
  /** The unknown times `root`, with a row of zeros on either side (and one more at the end). */
  x: Float64Array
  symmetric: boolean
}

export interface SorOutcome {
  sweeps: number
  /** Norm of the unscaled residual. */
  residual: number
  /** Estimated largest error left in any head. */
  headError: number
  ended: 'converged' | 'stalled' | 'sweeps' | 'cancelled'
  /** The over-relaxation factor as it was last refined. */
  factor: number
}

export interface SorOptions {
  /** Stop when the norm of the unscaled residual is at most this ... */
  target: number
  /** ... and the estimated error of every head at most this share of the range of the heads' changes. */
  headTolerance: number
  /** 2 / (1 + root(2 lambda)) is the first factor; see `slowestMode`. */
  lambda: number
  /** Zones whose common level is corrected at the end of every window; null: none. */
  zones: Zones | null
  mostSweeps: number
  /** Head change = unknown / weight. */
  weight: Float64Array
  /** Asked about ten times a second; true stops. */
  watch: (sweeps: number, residual: number, factor: number) => boolean
}

/** Scales the matrix in place to a unit diagonal and sets the system up for `rightHandSide`. */
export function scaledSystem(matrix: Matrix, rightHandSide: Float64Array, nx: number, ny: number): SorSystem {
  const count = nx * ny
  const { diag, west: w, east: e, south: s, north: n, corners, symmetric } = matrix
  const root = new Float64Array(count)
  const b = new Float64Array(count)
  for (let c = 0; c < count; c++) {
    root[c] = Math.sqrt(diag[c] as number)
    b[c] = (rightHandSide[c] as number) / (root[c] as number)
  }
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const c = j * nx + i
      const own = root[c] as number
      if (i > 0) w[c] = (w[c] as number) / (own * (root[c - 1] as number))
      if (j > 0) s[c] = (s[c] as number) / (own * (root[c - nx] as number))
      if (corners) scaleCorners(corners, root, c, i, nx, symmetric)
      // With a symmetric matrix east and north are the neighbours' west and south, the same memory.
      if (symmetric) continue
      if (i < nx - 1) e[c] = (e[c] as number) / (own * (root[c + 1] as number))
      if (j < ny - 1) n[c] = (n[c] as number) / (own * (root[c + nx] as number))
    }
  }
  return { nx, ny, b, w, e, s, n, corners, root, x: new Float64Array(count + 2 * nx + 1), symmetric }
}

function scaleCorners(
  { southWest, southEast, northWest, northEast }: CornerMatrix,
  root: Float64Array,
  c: number,
  i: number,
  nx: number,
  symmetric: boolean,
): void {
  function scale(link: Float64Array, other: number): void {
    if (other < 0 || other >= root.length) return
    link[c] = (link[c] as number) / ((root[c] as number) * (root[other] as number))
  }
  if (i > 0) scale(southWest, c - nx - 1)
  if (i < nx - 1) scale(southEast, c - nx + 1)
  if (symmetric) return
  if (i > 0) scale(northWest, c + nx - 1)
  if (i < nx - 1) scale(northEast, c + nx + 1)
}

interface Measure {
  norm: number
  /** Largest |residual / diagonal| as a change of head. */
  largest: number
  /** Highest minus lowest change of head so far. */
  range: number
  /** What rounding alone leaves of `norm` at these values. */
  floor: number
}

/** The true residual of the scaled system, recomputed from its definition. */
export function measure(system: SorSystem, weight: Float64Array, out: Measure): void {
  const { nx, ny, b, w, e, s, n, corners, root, x } = system
  let sum = 0
  let largest = 0
  let lowest = 0
  let highest = 0
  let size = 0
  const count = nx * ny
  for (let c = 0; c < count; c++) {
    const p = c + nx
    const r =
      (b[c] as number) +
      (w[c] as number) * (x[p - 1] as number) +
      (e[c] as number) * (x[p + 1] as number) +
      (s[c] as number) * (x[p - nx] as number) +
      (n[c] as number) * (x[p + nx] as number) +
      (corners ? cornerSum(corners, x, c, nx) : 0) -
      (x[p] as number)
    const scale = root[c] as number
    const unit = 1 / (scale * (weight[c] as number))
    sum += r * scale * r * scale
    size += (x[p] as number) * scale * (x[p] as number) * scale
    const change = Math.abs(r) * unit
    if (change > largest) largest = change
    const value = (x[p] as number) * unit
    if (value < lowest) lowest = value
    if (value > highest) highest = value
  }
  out.norm = Math.sqrt(sum)
  out.largest = largest
  out.range = highest - lowest
  out.floor = Number.EPSILON * Math.sqrt(size)
}

/**
 * Relaxes until the true residual and the estimated head error are small enough. The factor starts from the estimate
 * of the smallest eigenvalue (Garabedian 1956: 2 / (1 + C h)) and is raised when the convergence observed over a
 * window is slower than the factor promises, by Young's relation (Hageman & Young 1981, chapter 9)
 *
 *   mu = (Lambda + omega - 1) / (omega root(Lambda)),  omega' = 2 / (1 + root(1 - mu^2)).
 *
 * A window is three times the number of sweeps in which the factor promises a reduction by e. Head error: what a sweep
 * still changes, summed over all the sweeps to come.
 */
export function relax(system: SorSystem, options: SorOptions): SorOutcome {
  const { nx, ny, b, w, e, s, n, corners, x } = system
  const { target, headTolerance, weight } = options
  const now: Measure = { norm: 0, largest: 0, range: 0, floor: 0 }
  const { zones } = options
  let withMode = false
  if (zones) correctZones(system, weight, zones, withMode)
  measure(system, weight, now)
  // Away from symmetry a factor may let errors grow for long before they fall: then go back and relax less.
  const kept = system.symmetric ? null : x.slice()
  // Corrections upset what a window shows of the convergence: with them the factor may not run away towards 2.
  let highestOmega = zones ? 2 / (1 + 0.3 * Math.sqrt(2 * options.lambda)) : 2 - 1e-7
  let omega = 2 / (1 + Math.sqrt(2 * Math.min(options.lambda, 0.5)))
  let sweeps = 0
  let windowSweeps = 0
  let windowNorm = now.norm
  let bestNorm = now.norm
  let idleWindows = 0
  let observed = omega - 1
  let headError = Number.POSITIVE_INFINITY
  let ended: SorOutcome['ended'] = now.norm <= target && target > 0 ? 'converged' : 'sweeps'
  if (now.norm === 0) return { sweeps, residual: 0, headError: 0, ended: 'converged', factor: omega }
  let secondsPerSweep = 0
  // With links to corners Young's relation only guesses: a factor that made it slower is taken back for good.
  let trial: { omega: number; rate: number; windows: number } | null = null
  while (sweeps < options.mostSweeps) {
    const window = Math.max(12, Math.ceil(3 / (2 - omega)))
    const affordable = secondsPerSweep > 0 ? Math.max(1, Math.floor(0.1 / secondsPerSweep)) : 4
    const block = Math.min(Math.max(6, Math.ceil(window / 6)), affordable, options.mostSweeps - sweeps)
    const started = performance.now()
    for (let k = 0; k < block; k++) {
      if (corners) sweepNine(x, b, w, e, s, n, corners, nx, ny, omega)
      else sweep(x, b, w, e, s, n, nx, ny, omega)
    }
    sweeps += block
    windowSweeps += block
    measure(system, weight, now)
    secondsPerSweep = (performance.now() - started) / 1000 / block
    // The slower of what the factor promises and what was seen.
    headError = (now.largest * omega) / (1 - Math.min(0.999999, Math.max(omega - 1, observed)))
    if (options.watch(sweeps, now.norm, omega)) {
      ended = 'cancelled'
      break
    }
    if (kept && !(now.norm <= 1e3 * windowNorm) && omega > 1) {
      x.set(kept)
      highestOmega = omega < 1.05 ? 1 : 1 + 0.5 * (omega - 1)
      omega = highestOmega
      observed = omega - 1
      windowSweeps = 0
      continue
    }
    if (!Number.isFinite(now.norm)) break
    if (now.norm <= target && headError <= headTolerance * now.range) {
      ended = 'converged'
      break
    }
    if (now.norm <= now.floor) {
      ended = 'stalled'
      headError = stalledError(now, options.lambda, omega)
      break
    }
    if (windowSweeps < window) continue
    const lambda = (now.norm / windowNorm) ** (1 / windowSweeps)
    idleWindows = now.norm < 0.7 * bestNorm ? 0 : idleWindows + 1
    bestNorm = Math.min(bestNorm, now.norm)
    observed = Math.min(lambda, 0.999999)
    if (trial && ++trial.windows >= 2) {
      if (lambda > trial.rate) {
        omega = trial.omega
        highestOmega = omega
      }
      trial = null
    }
    if (!trial && lambda < 1 && now.norm > 30 * now.floor && Math.log(lambda) > 0.6 * Math.log(omega - 1)) {
      const mu = (lambda + omega - 1) / (omega * Math.sqrt(lambda))
      if (mu < 1) {
        const better = 2 / (1 + Math.sqrt(1 - mu * mu))
        // The slowest mode is corrected apart only when convergence shows that it is there.
        if (zones?.mode && !withMode) withMode = true
        else if (better > omega + 1e-3 * (2 - omega) && omega < highestOmega) {
          if (corners) trial = { omega, rate: lambda, windows: 0 }
          omega = Math.min(better, highestOmega)
          idleWindows = 0
        }
      }
    }
    if (zones && now.norm > 30 * now.floor) {
      correctZones(system, weight, zones, withMode)
      measure(system, weight, now)
    }
    windowSweeps = 0
    windowNorm = now.norm
    kept?.set(x)
    if (idleWindows >= 6) {
      ended = 'stalled'
      headError = stalledError(now, options.lambda, omega)
      break
    }
  }
  return { sweeps, residual: now.norm, headError, ended, factor: omega }
}

/** Raises or lowers each zone as a whole until it balances with the others. */
function correctZones(system: SorSystem, weight: Float64Array, zones: Zones, withMode: boolean): void {
  const { nx, ny, b, w, e, s, n, corners, root, x } = system
  const { count: zoneCount, zoneOf } = zones
  const mode = withMode ? zones.mode : null
  const excess = Array.from({ length: zones.matrix.length }, () => 0)
  const count = nx * ny
  for (let c = 0; c < count; c++) {
    const zone = zoneOf[c] as number
    if (zone < 0) continue
    const p = c + nx
    const r =
      (b[c] as number) +
      (w[c] as number) * (x[p - 1] as number) +
      (e[c] as number) * (x[p + 1] as number) +
      (s[c] as number) * (x[p - nx] as number) +
      (n[c] as number) * (x[p + nx] as number) +
      (corners ? cornerSum(corners, x, c, nx) : 0) -
      (x[p] as number)
    const flow = r * (root[c] as number)
    excess[zone] = (excess[zone] as number) + flow
    if (mode) excess[zoneCount] = (excess[zoneCount] as number) + flow * (mode[c] as number)
  }
  const rise = solveDense(zones.matrix, excess)
  if (!rise.every(Number.isFinite)) return
  const ofMode = mode ? (rise[zoneCount] as number) : 0
  for (let c = 0; c < count; c++) {
    const zone = zoneOf[c] as number
    if (zone < 0) continue
    const change = (rise[zone] as number) * (weight[c] as number) + (mode ? ofMode * (mode[c] as number) : 0)
    x[c + nx] = (x[c + nx] as number) + change * (root[c] as number)
  }
}

/** At the rounding floor nothing converges that could be watched: |error| <= |residual / diagonal| / lambda. */
function stalledError(now: Measure, lambda: number, omega: number): number {
  return now.largest / Math.min(lambda, 0.5 * ((2 - omega) / omega) ** 2)
}

/** One grid of the hierarchy that the eigenvalue is estimated on; `gain` is what leaves to held heads, by cell. */
interface Level {
  nx: number
  ny: number
  alongX: Float64Array
  alongY: Float64Array
  gain: Float64Array
  mass: Float64Array
}

/**
 * Estimates the smallest eigenvalue of the matrix scaled to a unit diagonal, from above: the slowest mode is found on
 * grids coarsened two by two, carried back and smoothed, and its Rayleigh quotient taken on the fine grid (an error of
 * the mode enters only squared). With mu = 1 - lambda the best factor is 2 / (1 + root(1 - mu^2)) (Young 1954).
 */
export function slowestMode(matrix: Matrix, nx: number, ny: number): { lambda: number; mode: Float64Array } {
  const levels = [finest(matrix, nx, ny)]
  for (;;) {
    const fine = levels[levels.length - 1] as Level
    if (fine.nx <= 6 && fine.ny <= 6) break
    levels.push(coarsened(fine))
  }
  let level = levels[levels.length - 1] as Level
  let mode = new Float64Array(level.nx * level.ny).fill(1)
  smooth(level, mode, 0, 1)
  for (let k = 0; k < 60; k++) smooth(level, mode, Math.min(rayleigh(level, mode), 0.9), 2)
  for (let l = levels.length - 2; l >= 0; l--) {
    const coarse = level
    level = levels[l] as Level
    mode = carried(coarse, level, mode)
    for (let k = 0; k < 3; k++) smooth(level, mode, Math.min(rayleigh(level, mode), 0.9), 4)
  }
  const lambda = rayleigh(level, mode)
  return { lambda: Number.isFinite(lambda) ? Math.min(1, Math.max(lambda, 1e-14)) : 1, mode }
}

function finest(matrix: Matrix, nx: number, ny: number): Level {
  const count = nx * ny
  const { diag, west, east, south, north, corners, symmetric } = matrix
  const alongX = symmetric && !corners ? west : new Float64Array(count)
  const alongY = symmetric && !corners ? south : new Float64Array(count)
  const gain = new Float64Array(count)
  const mass = new Float64Array(count)
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const c = j * nx + i
      if (alongX !== west) {
        // Links that oblique directions make negative count as none: the estimate stays one from above.
        if (i > 0) alongX[c] = meanLink(west[c] as number, east[c - 1] as number)
        if (j > 0) alongY[c] = meanLink(south[c] as number, north[c - nx] as number)
      }
      const others =
        (west[c] as number) +
        (i < nx - 1 ? (east[c] as number) : 0) +
        (south[c] as number) +
        (j < ny - 1 ? (north[c] as number) : 0) +
        (corners ? cornerLinks(corners, c, i, j, nx, ny) : 0)
      // Cells without ground and held cells are tied to none and take no part in any mode.
      if (others === 0) continue
      gain[c] = Math.max(0, (diag[c] as number) - others)
      mass[c] = diag[c] as number
    }
  }
  return { nx, ny, alongX, alongY, gain, mass }
}

function meanLink(a: number, b: number): number {
  return a > 0 && b > 0 ? Math.sqrt(a * b) : 0
}

/** Sum of a cell's links to its corner cells. */
function cornerLinks(corners: CornerMatrix, c: number, i: number, j: number, nx: number, ny: number): number {
  const [west, east, south, north] = [i > 0, i < nx - 1, j > 0, j < ny - 1]
  return (
    (south && west ? (corners.southWest[c] as number) : 0) +
    (south && east ? (corners.southEast[c] as number) : 0) +
    (north && west ? (corners.northWest[c] as number) : 0) +
    (north && east ? (corners.northEast[c] as number) : 0)
  )
}

function coarsened(fine: Level): Level {
  const stepX = fine.nx > 6 ? 2 : 1
  const stepY = fine.ny > 6 ? 2 : 1
  const nx = Math.ceil(fine.nx / stepX)
  const ny = Math.ceil(fine.ny / stepY)
  const alongX = new Float64Array(nx * ny)
  const alongY = new Float64Array(nx * ny)
  const gain = new Float64Array(nx * ny)
  const mass = new Float64Array(nx * ny)
  for (let j = 0; j < fine.ny; j++) {
    for (let i = 0; i < fine.nx; i++) {
      const c = j * fine.nx + i
      const C = Math.floor(j / stepY) * nx + Math.floor(i / stepX)
      // Centres of coarse cells are twice as far apart, so links carry half.
      if (i % stepX === 0 && i > 0) alongX[C] = (alongX[C] as number) + (fine.alongX[c] as number) / stepX
      if (j % stepY === 0 && j > 0) alongY[C] = (alongY[C] as number) + (fine.alongY[c] as number) / stepY
      gain[C] = (gain[C] as number) + (fine.gain[c] as number) / Math.max(stepX, stepY)
      mass[C] = (mass[C] as number) + (fine.mass[c] as number)
    }
  }
  return { nx, ny, alongX, alongY, gain, mass }
}

/** Gauss-Seidel sweeps on (A - lambda M) v = 0: the mode's rough parts die out, its smooth part stays. */
function smooth(level: Level, v: Float64Array, lambda: number, sweeps: number): void {
  const { nx, ny, alongX, alongY, gain, mass } = level
  for (let k = 0; k < sweeps; k++) {
    for (let j = 0; j < ny; j++) {
      for (let i = 0; i < nx; i++) {
        const c = j * nx + i
        const west = alongX[c] as number
        const south = alongY[c] as number
        const east = i < nx - 1 ? (alongX[c + 1] as number) : 0
        const north = j < ny - 1 ? (alongY[c + nx] as number) : 0
        const own = west + east + south + north + (gain[c] as number)
        if (own === 0) continue
        let sum = lambda * (mass[c] as number) * (v[c] as number)
        if (i > 0) sum += west * (v[c - 1] as number)
        if (i < nx - 1) sum += east * (v[c + 1] as number)
        if (j > 0) sum += south * (v[c - nx] as number)
        if (j < ny - 1) sum += north * (v[c + nx] as number)
        v[c] = sum / own
      }
    }
  }
}

function rayleigh(level: Level, v: Float64Array): number {
  const { nx, ny, alongX, alongY, gain, mass } = level
  let energy = 0
  let weight = 0
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const c = j * nx + i
      const value = v[c] as number
      energy += (gain[c] as number) * value * value
      if (i > 0) energy += (alongX[c] as number) * (value - (v[c - 1] as number)) ** 2
      if (j > 0) energy += (alongY[c] as number) * (value - (v[c - nx] as number)) ** 2
      weight += (mass[c] as number) * value * value
    }
  }
  return weight > 0 ? energy / weight : 1
}

/** The coarse mode on the finer grid: bilinear between the coarse centres. */
function carried(coarse: Level, fine: Level, mode: Float64Array): Float64Array<ArrayBuffer> {
  const out = new Float64Array(fine.nx * fine.ny)
  const stepX = coarse.nx < fine.nx ? 2 : 1
  const stepY = coarse.ny < fine.ny ? 2 : 1
  for (let j = 0; j < fine.ny; j++) {
    const J = Math.floor(j / stepY)
    const nextJ = stepY === 1 ? J : Math.min(coarse.ny - 1, Math.max(0, j % 2 === 0 ? J - 1 : J + 1))
    for (let i = 0; i < fine.nx; i++) {
      const I = Math.floor(i / stepX)
      const nextI = stepX === 1 ? I : Math.min(coarse.nx - 1, Math.max(0, i % 2 === 0 ? I - 1 : I + 1))
      const near = 0.75 * (mode[J * coarse.nx + I] as number) + 0.25 * (mode[J * coarse.nx + nextI] as number)
      const far =
        0.75 * (mode[nextJ * coarse.nx + I] as number) + 0.25 * (mode[nextJ * coarse.nx + nextI] as number)
      out[j * fine.nx + i] = 0.75 * near + 0.25 * far
    }
  }
  return out
}
