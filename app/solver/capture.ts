import {
  type Direction,
  endOf,
  type RingStart,
  ringRound,
  type Track,
  thinned,
  track,
  type Velocities,
} from './flow-lines'
import { cellAt } from './grid'
import type { Position } from './model'
import { signedArea } from './polygon'
import type { CaptureResult, CaptureSource, CaptureZone } from './result'
import type { PlacedWell } from './wells'

/** Where the water of every place of a raster goes, row by row from the lowest y; see `CaptureResult.drains`. */
export interface CaptureRaster {
  columns: number
  rows: number
  /** Index into `drains`, -1 where there is no ground. */
  drainsTo: Int16Array
  /** Time until it gets there, NaN where it never does. */
  time: Float64Array
}

export interface Capture {
  result: CaptureResult
  raster: CaptureRaster
}

export interface CaptureOptions {
  /** A finer grid is looked at on a raster of about this many places. */
  mostPlaces?: number
  isCancelled?: () => boolean
}

/**
 * Which ground drains to which well or boundary: flow lines forward from every cell's centre, on a coarser raster when
 * there are too many; and the outline of each abstraction well's zone within each time and without limit, by lines
 * against the flow from the ring round the well, ever closer where they part. Null when cancelled.
 */
export function captureOf(
  field: Velocities,
  times: number[],
  { mostPlaces = 40_000, isCancelled }: CaptureOptions = {},
): Capture | null {
  const { grid, flow } = field
  const { d } = flow
  const step = Math.max(1, Math.ceil(Math.sqrt((grid.columns * grid.rows) / mostPlaces)))
  const columns = Math.ceil(grid.columns / step)
  const rows = Math.ceil(grid.rows / step)
  const raster: CaptureRaster = {
    columns,
    rows,
    drainsTo: new Int16Array(columns * rows).fill(-1),
    time: new Float64Array(columns * rows).fill(Number.NaN),
  }
  const drains: CaptureResult['drains'] = []
  const indexOf = new Map<string, number>()
  let whole = 0
  for (let row = 0; row < rows; row++) {
    if (isCancelled?.()) return null
    const [south, north] = span(grid.yEdges, row, step, grid.rows)
    for (let column = 0; column < columns; column++) {
      const [west, east] = span(grid.xEdges, column, step, grid.columns)
      const x = (west + east) / 2
      const y = (south + north) / 2
      const cell = cellAt(grid, x, y)
      if (d.active[cell] !== 1) continue
      const found = track(field, x, y, 'forward', { cell })
      const end = endOf(field, found, 'forward')
      const key = `${end.at} ${end.name}`
      let index = indexOf.get(key)
      if (index === undefined) {
        index = drains.push({ ...end, area: 0, share: 0 }) - 1
        indexOf.set(key, index)
      }
      const area = (east - west) * (north - south)
      whole += area
      const drain = drains[index] as (typeof drains)[number]
      drain.area += area
      raster.drainsTo[row * columns + column] = index
      if (end.at !== 'stagnation' && end.at !== 'limit') raster.time[row * columns + column] = found.time
    }
  }
  for (const drain of drains) drain.share = drain.area / whole
  const wells = d.wells.flatMap((well, index) => {
    if (!((field.rates[index] as number) < 0)) return []
    const ring = ringRound(field, well, 'back')
    const zones = ring ? [...times, null].map((time): CaptureZone => zoneWithin(field, well, ring, time)) : []
    return [{ name: well.name, sources: ring ? sourcesOf(field, ring) : [], zones }]
  })
  return { result: { drains, wells, raster: { columns, rows, cells: step } }, raster }
}

function span(edges: Float64Array, index: number, step: number, count: number): [number, number] {
  return [edges[index * step] as number, edges[Math.min(count, (index + 1) * step)] as number]
}

const sourceLines = 200

/** Where a well's water comes from, by lines against the flow that carry equal shares of it. */
function sourcesOf(field: Velocities, ring: (share: number) => RingStart): CaptureSource[] {
  const sources = new Map<string, CaptureSource>()
  for (let k = 0; k < sourceLines; k++) {
    const { x, y, cell } = ring((k + 0.5) / sourceLines)
    const end = endOf(field, track(field, x, y, 'back', { cell }), 'back')
    const key = `${end.at} ${end.name}`
    const source = sources.get(key) ?? { ...end, share: 0 }
    source.share += 1 / sourceLines
    sources.set(key, source)
  }
  return [...sources.values()].sort((a, b) => b.share - a.share)
}

const firstLines = 48
const mostLines = 600
const closest = 1 / 4096

/** A line against the flow from the ring round a well; `line`: its path, thinned. */
interface Spoke {
  share: number
  path: number[]
  line: Position[]
  end: Position
}

/** The zone from which a well draws within `time` (null: ever). */
function zoneWithin(
  field: Velocities,
  well: PlacedWell,
  ring: (share: number) => RingStart,
  time: number | null,
): CaptureZone {
  const { grid } = field
  const far =
    2 *
    Math.max(
      ((grid.xEdges[grid.columns] as number) - (grid.xEdges[0] as number)) / grid.columns,
      ((grid.yEdges[grid.rows] as number) - (grid.yEdges[0] as number)) / grid.rows,
    )
  function spokeAt(share: number): Spoke {
    const start = ring(share)
    const left = (time ?? Number.POSITIVE_INFINITY) - start.time
    if (left <= 0) {
      const part = Math.sqrt((time as number) / start.time)
      const end: Position = [well.x + part * (start.x - well.x), well.y + part * (start.y - well.y)]
      return { share, path: [...end, 0], line: [end], end }
    }
    const found: Track = track(field, start.x, start.y, 'back' satisfies Direction, {
      record: true,
      within: left,
      cell: start.cell,
    })
    return { share, path: found.path, line: thinned(grid, found.path).line, end: [found.x, found.y] }
  }
  const spokes = Array.from({ length: firstLines }, (_, k) => spokeAt((k + 0.5) / firstLines))
  for (let k = 0; k < spokes.length && spokes.length < mostLines; ) {
    const a = spokes[k] as Spoke
    const b = spokes[(k + 1) % spokes.length] as Spoke
    const gap = b.share - a.share + (k + 1 === spokes.length ? 1 : 0)
    if (gap > closest && parted(a, b, far)) spokes.splice(k + 1, 0, spokeAt(a.share + gap / 2))
    else k++
  }
  const outline: Position[] = []
  for (let k = 0; k < spokes.length; k++) {
    const a = spokes[k] as Spoke
    const b = spokes[(k + 1) % spokes.length] as Spoke
    outline.push(a.end)
    // Where neighbours part, the zone ends along both of them, from where they were last together.
    if (parted(a, b, far)) outline.push(...alongBoth(field, a, b, far / 2))
  }
  return { time, area: Math.abs(signedArea(outline)), outline }
}

/** Do the lines end, or run anywhere on their way, farther apart than that? */
function parted(a: Spoke, b: Spoke, far: number): boolean {
  if (apart(a.end, b.end) > far) return true
  return (
    a.line.some((place) => awayFrom(b.line, place) > far) ||
    b.line.some((place) => awayFrom(a.line, place) > far)
  )
}

function awayFrom(line: Position[], [x, y]: Position): number {
  let nearest = apart(line[0] as Position, [x, y])
  for (let k = 0; k + 1 < line.length; k++) {
    const [a, b] = [line[k] as Position, line[k + 1] as Position]
    const square = (b[0] - a[0]) ** 2 + (b[1] - a[1]) ** 2
    const along = square > 0 ? ((x - a[0]) * (b[0] - a[0]) + (y - a[1]) * (b[1] - a[1])) / square : 0
    const t = Math.min(1, Math.max(0, along))
    nearest = Math.min(nearest, Math.hypot(a[0] + t * (b[0] - a[0]) - x, a[1] + t * (b[1] - a[1]) - y))
  }
  return nearest
}

function apart(a: Position, b: Position): number {
  return Math.hypot(a[0] - b[0], a[1] - b[1])
}

function alongBoth(field: Velocities, a: Spoke, b: Spoke, near: number): Position[] {
  const down = placesOf(a.path)
  const up = placesOf(b.path)
  let from = 0
  let to = 0
  for (let k = 0; k < down.length; k++) {
    const close = up.findIndex((place) => apart(place, down[k] as Position) < near)
    if (close < 0) break
    from = k
    to = close
  }
  const { line: back } = thinned(field.grid, a.path.slice(3 * from))
  const { line: out } = thinned(field.grid, b.path.slice(3 * to))
  return [...back.reverse(), ...out]
}

function placesOf(path: number[]): Position[] {
  return Array.from(
    { length: path.length / 3 },
    (_, k): Position => [path[3 * k] as number, path[3 * k + 1] as number],
  )
}
