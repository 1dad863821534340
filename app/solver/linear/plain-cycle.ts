import type { Interpolation, Level } from './plain-grids'

function at(values: Float64Array, c: number): number {
  return values[c] as number
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

/** Red-black on five points; four colours on nine, those of even rows first; backwards after the coarse correction. */
export function smooth(level: Level, backwards: boolean): void {
  if (level.fivePoint) {
    relax(level, backwards ? 1 : 0, 0, 1)
    relax(level, backwards ? 0 : 1, 0, 1)
    return
  }
  for (let k = 0; k < 4; k++) {
    const colour = backwards ? 3 - k : k
    relax(level, colour & 1, colour >> 1, 2)
  }
}

/** into = b - A x, each link's flow by the difference of its ends. */
export function residual(level: Level, x: Float64Array, b: Float64Array, into: Float64Array): void {
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
export function factor(level: Level): Float64Array {
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

export function solveDirectly(level: Level, l: Float64Array, y: Float64Array): void {
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

export function restrict(fine: Level, { parent, share }: Interpolation, coarse: Level): void {
  coarse.b.fill(0)
  for (let c = 0; c < fine.r.length; c++) {
    for (let k = 4 * c; k < 4 * c + 4; k++) {
      const id = parent[k] as number
      if (id >= 0) coarse.b[id] = at(coarse.b, id) + at(share, k) * at(fine.r, c)
    }
  }
}

export function correct(fine: Level, { parent, share }: Interpolation, coarse: Level): void {
  for (let c = 0; c < fine.x.length; c++) {
    let sum = at(fine.x, c)
    for (let k = 4 * c; k < 4 * c + 4; k++) {
      const id = parent[k] as number
      if (id >= 0) sum += at(share, k) * at(coarse.x, id)
    }
    fine.x[c] = sum
  }
}
