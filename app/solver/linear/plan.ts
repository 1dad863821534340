/** Where everything lies in a solver's memory, in bytes (kernels/layout.as and kernels/colours.as), for all threads. */
export interface Plan {
  columns: number
  rows: number
  /** The finest grid: arrays of single and of double precision, bytes a single-precision array and row. */
  single: number
  double: number
  size: number
  stride: number
  /** From the finest grid to the first coarse one. */
  way: Way
  /** Coarse grids, finest first. */
  grids: Grid[]
  /** Inverse matrix of the coarsest grid, bytes a row of it, and memory to make it in. */
  inverse: number
  width: number
  unknowns: number
  work: number
  wide: number
  /** Not 0: there are cells without an equation. */
  gaps: number
  /** Where rows in the order of the cells pass through: so many at a time. */
  stage: number
  staged: number
  /** Sums that parts of the rows contribute to (eight doubles a part), and counters that threads wait on. */
  sums: number
  waits: number
  bytes: number
}

/** From a grid to the next coarser one. */
export interface Way {
  /** Only every second column left out; otherwise every second row too. */
  along: boolean
  shares: number
  sharesSize: number
  /** Memory for two coarse rows in the order of their columns, `apart` bytes from one another; one such for each part. */
  natural: number
  apart: number
  /** Memory for the shares of the cells in the middle of four, while the coarse matrix is made; bytes a row. */
  middles: number
  middleRow: number
}

export interface Grid {
  columns: number
  rows: number
  at: number
  size: number
  stride: number
  half: number
  way: Way
}

/** Parts that the rows can be shared out to. */
export const mostParts = 2

export const nineArrays = {
  count: 9,
  east: 0,
  north: 1,
  northEast: 2,
  northWest: 3,
  own: 4,
  inverse: 5,
  x: 6,
  b: 7,
}
export const singleArrays = { count: 10, scaled: 6, z: 7 }
export const doubleArrays = { count: 11, blackOwn: 6, p: 7, q: 8, redX: 9 }

function upTo(value: number, multiple: number): number {
  return Math.ceil(value / multiple) * multiple
}

/** Large arrays whose sizes are multiples of a page crowd into the same places of a cache: keep them apart. */
function sizeOf(bytes: number): number {
  const size = upTo(bytes, 64)
  return size > 65536 ? upTo(size, 4096) + 576 : size
}

/** Bytes of half a row of a nine-point grid, or of a row of one colour: rim of four numbers and the cells. */
function halfOf(columns: number): number {
  return 4 * (upTo((columns + 1) >> 1, 4) + 4)
}

function take(plan: Plan, bytes: number): number {
  const at = plan.bytes
  plan.bytes = upTo(at + bytes, 64)
  return at
}

const nowhere: Way = {
  along: false,
  shares: 0,
  sharesSize: 0,
  natural: 0,
  apart: 0,
  middles: 0,
  middleRow: 0,
}

/** The finest grid's share of the memory; `along`: which way it is to be coarsened. */
export function planFinest(columns: number, rows: number, along: boolean): Plan {
  const stride = halfOf(columns)
  const size = sizeOf((rows + 4) * stride + 16)
  const staged = Math.max(1, Math.min(rows, Math.floor(65536 / (8 * columns))))
  const plan: Plan = {
    columns,
    rows,
    single: 0,
    double: 0,
    size,
    stride,
    way: nowhere,
    grids: [],
    inverse: 0,
    width: 0,
    unknowns: 0,
    work: 0,
    wide: 0,
    gaps: 0,
    stage: 0,
    staged,
    sums: 0,
    waits: 0,
    bytes: 1024,
  }
  plan.sums = take(plan, 64 * mostParts)
  plan.waits = take(plan, 64)
  plan.single = take(plan, singleArrays.count * size)
  plan.double = take(plan, 2 * doubleArrays.count * size)
  // A little room before it: the cell west of the first one.
  plan.stage = take(plan, 8 * columns * (3 * staged + 1) + 64) + 64
  planCoarser(plan, along)
  return plan
}

function wayTo(plan: Plan, fineHalf: number, coarse: Grid, along: boolean): Way {
  const sharesSize = sizeOf((coarse.rows + 2) * fineHalf + 16)
  const apart = upTo(Math.max(coarse.stride, fineHalf) + 32, 16)
  const shares = take(plan, 4 * sharesSize)
  const natural = take(plan, 2 * apart * mostParts)
  const middleRow = upTo(8 * (coarse.columns + 2), 64)
  return {
    along,
    shares,
    sharesSize,
    apart,
    natural,
    middleRow,
    middles: along ? 0 : take(plan, 8 * middleRow),
  }
}

/** Adds the next coarser grid. */
export function planCoarser(plan: Plan, along: boolean): Grid {
  const fine = plan.grids[plan.grids.length - 1]
  const columns = ((fine ?? plan).columns + 1) >> 1
  const above = (fine ?? plan).rows
  const rows = along ? above : (above + 1) >> 1
  const half = halfOf(columns)
  const size = sizeOf((rows + 2) * 2 * half + 16)
  const at = take(plan, nineArrays.count * size)
  const coarse: Grid = { columns, rows, at, size, stride: 2 * half, half, way: nowhere }
  const way = wayTo(plan, fine ? fine.half : plan.stride, coarse, along)
  if (fine) fine.way = way
  else plan.way = way
  plan.grids.push(coarse)
  return coarse
}

/** Room for the coarsest grid's inverse matrix. */
export function planInverse(plan: Plan): void {
  const last = plan.grids[plan.grids.length - 1] as Grid
  plan.unknowns = last.columns * last.rows
  plan.width = 4 * upTo(plan.unknowns, 4)
  plan.inverse = take(plan, plan.unknowns * plan.width + 2 * plan.width)
  plan.wide = 8 * upTo(plan.unknowns, 2)
  plan.work = take(plan, plan.unknowns * plan.wide)
}
