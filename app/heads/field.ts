/**
 * A head field as figures and tables use it: one value for each cell, row by row from the lowest y, NaN where the
 * model has no head (outside it, or dry). `xEdges` and `yEdges` rise; all in one unit of length.
 */
export interface HeadField {
  xEdges: Float64Array
  yEdges: Float64Array
  heads: Float64Array
}

/** Centres between edges. */
export function centresBetween(edges: Float64Array): Float64Array {
  return Float64Array.from(
    { length: edges.length - 1 },
    (_, i) => ((edges[i] as number) + (edges[i + 1] as number)) / 2,
  )
}

/** Index of the interval of rising `edges` that holds `value`, its ends included; -1 beyond either end. */
function intervalHolding(edges: Float64Array, value: number): number {
  const last = edges.length - 1
  if (!(value >= (edges[0] as number) && value <= (edges[last] as number))) return -1
  let low = 0
  let high = last
  while (high - low > 1) {
    const middle = (low + high) >> 1
    if ((edges[middle] as number) <= value) low = middle
    else high = middle
  }
  return low
}

interface Neighbours {
  low: number
  high: number
  /** Weight of `high`; below 0 or above 1 in the outer half cell, where the line through two centres is carried on. */
  weight: number
}

function neighboursOf(edges: Float64Array, cell: number, value: number): Neighbours {
  const centre = (i: number) => ((edges[i] as number) + (edges[i + 1] as number)) / 2
  const last = edges.length - 2
  if (last === 0) return { low: 0, high: 0, weight: 0 }
  const low = Math.min(last - 1, value < centre(cell) ? Math.max(0, cell - 1) : cell)
  return { low, high: low + 1, weight: (value - centre(low)) / (centre(low + 1) - centre(low)) }
}

/**
 * Head at (x, y), bilinear between cell centres; NaN outside the extent and in a cell without a head. Beside cells
 * without a head it is the weighted mean of the neighbours that have one.
 */
export function headAt(field: HeadField, x: number, y: number): number {
  const { xEdges, yEdges, heads } = field
  const columns = xEdges.length - 1
  const i = intervalHolding(xEdges, x)
  const j = intervalHolding(yEdges, y)
  if (i < 0 || j < 0) return Number.NaN
  const own = heads[j * columns + i] as number
  if (Number.isNaN(own)) return Number.NaN
  const across = neighboursOf(xEdges, i, x)
  const up = neighboursOf(yEdges, j, y)
  const corners: [number, number, number][] = [
    [across.low, up.low, (1 - across.weight) * (1 - up.weight)],
    [across.high, up.low, across.weight * (1 - up.weight)],
    [across.low, up.high, (1 - across.weight) * up.weight],
    [across.high, up.high, across.weight * up.weight],
  ]
  const values = corners.map(([column, row]) => heads[row * columns + column] as number)
  if (!values.some(Number.isNaN)) {
    return corners.reduce((sum, [, , weight], k) => sum + weight * (values[k] as number), 0)
  }
  let sum = 0
  let weights = 0
  for (const [k, [, , weight]] of corners.entries()) {
    const value = values[k] as number
    if (Number.isNaN(value) || weight <= 0) continue
    sum += weight * value
    weights += weight
  }
  return weights > 0 ? sum / weights : own
}

function sameEdges(a: Float64Array, b: Float64Array): boolean {
  return a.length === b.length && a.every((edge, i) => edge === b[i])
}

/** Drawdown = head before - head now, on the grid of `now`; NaN wherever either has no head. */
export function drawdownBetween(now: HeadField, before: HeadField): HeadField {
  const columns = now.xEdges.length - 1
  if (sameEdges(now.xEdges, before.xEdges) && sameEdges(now.yEdges, before.yEdges)) {
    return { ...now, heads: now.heads.map((head, cell) => (before.heads[cell] as number) - head) }
  }
  const x = centresBetween(now.xEdges)
  const y = centresBetween(now.yEdges)
  return {
    ...now,
    heads: now.heads.map(
      (head, cell) =>
        headAt(before, x[cell % columns] as number, y[Math.floor(cell / columns)] as number) - head,
    ),
  }
}

export interface FieldRange {
  low: number
  high: number
  /** Centres of the cells that hold them. */
  lowAt: [x: number, y: number]
  highAt: [x: number, y: number]
}

/** The lowest and the highest cell; null when no cell has a head. */
export function rangeOf(field: HeadField): FieldRange | null {
  const columns = field.xEdges.length - 1
  let lowest = -1
  let highest = -1
  for (let cell = 0; cell < field.heads.length; cell++) {
    const head = field.heads[cell] as number
    if (Number.isNaN(head)) continue
    if (lowest < 0 || head < (field.heads[lowest] as number)) lowest = cell
    if (highest < 0 || head > (field.heads[highest] as number)) highest = cell
  }
  if (lowest < 0) return null
  const centre = (edges: Float64Array, i: number) => ((edges[i] as number) + (edges[i + 1] as number)) / 2
  const place = (cell: number): [number, number] => [
    centre(field.xEdges, cell % columns),
    centre(field.yEdges, Math.floor(cell / columns)),
  ]
  return {
    low: field.heads[lowest] as number,
    high: field.heads[highest] as number,
    lowAt: place(lowest),
    highAt: place(highest),
  }
}
