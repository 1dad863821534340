import type { Vertex } from '~/book/field'

/** Geometry of lines in a figure: pixels in, pixels out. Nothing here needs a clipping path or a pattern fill. */

export interface Rectangle {
  left: number
  top: number
  width: number
  height: number
}

/** The parts of a line inside an upright rectangle (Liang and Barsky, 1984, piece by piece). */
export function clippedLine(line: readonly Vertex[], { left, top, width, height }: Rectangle): Vertex[][] {
  const parts: Vertex[][] = []
  let part: Vertex[] = []
  for (let k = 1; k < line.length; k++) {
    const [x, y] = line[k - 1] as Vertex
    const [toX, toY] = line[k] as Vertex
    const dx = toX - x
    const dy = toY - y
    let enter = 0
    let leave = 1
    const sides: [number, number][] = [
      [-dx, x - left],
      [dx, left + width - x],
      [-dy, y - top],
      [dy, top + height - y],
    ]
    for (const [run, room] of sides) {
      if (run === 0) {
        if (room < -1e-6) leave = -1
      } else if (run < 0) enter = Math.max(enter, room / run)
      else leave = Math.min(leave, room / run)
    }
    if (enter > leave) {
      if (part.length > 1) parts.push(part)
      part = []
      continue
    }
    if (part.length === 0 || enter > 0) {
      if (part.length > 1) parts.push(part)
      part = [[x + enter * dx, y + enter * dy]]
    }
    part.push([x + leave * dx, y + leave * dy])
    if (leave < 1) {
      parts.push(part)
      part = []
    }
  }
  if (part.length > 1) parts.push(part)
  return parts
}

/** A polygon cut to an upright rectangle (Sutherland and Hodgman, 1974); empty when it lies outside. */
export function clippedPolygon(ring: readonly Vertex[], { left, top, width, height }: Rectangle): Vertex[] {
  const sides: [axis: 0 | 1, limit: number, sign: 1 | -1][] = [
    [0, left, 1],
    [0, left + width, -1],
    [1, top, 1],
    [1, top + height, -1],
  ]
  let inside = [...ring]
  for (const [axis, limit, sign] of sides) {
    const kept: Vertex[] = []
    for (const [k, vertex] of inside.entries()) {
      const next = inside[(k + 1) % inside.length] as Vertex
      const here = (vertex[axis] - limit) * sign
      const there = (next[axis] - limit) * sign
      if (here >= 0) kept.push(vertex)
      if (here >= 0 !== there >= 0) {
        const t = here / (here - there)
        kept.push([vertex[0] + (next[0] - vertex[0]) * t, vertex[1] + (next[1] - vertex[1]) * t])
      }
    }
    inside = kept
  }
  return inside
}

/** Parallel lines at 45 degrees inside a polygon, `spacing` apart, in step with the whole figure. */
export function hatchOf(ring: readonly Vertex[], spacing: number): [Vertex, Vertex][] {
  // Along u = (x + y) / sqrt 2 the hatch lines are u = constant; v = (y - x) / sqrt 2 runs along them.
  const turned = ring.map(([x, y]): Vertex => [(x + y) * Math.SQRT1_2, (y - x) * Math.SQRT1_2])
  const places = turned.map(([u]) => u)
  const lines: [Vertex, Vertex][] = []
  const last = Math.floor(Math.max(...places) / spacing)
  for (let k = Math.ceil(Math.min(...places) / spacing); k <= last; k++) {
    const u = k * spacing
    const crossings: number[] = []
    for (const [i, [u1, v1]] of turned.entries()) {
      const [u2, v2] = turned[(i + 1) % turned.length] as Vertex
      if (u1 <= u !== u2 <= u) crossings.push(v1 + ((v2 - v1) * (u - u1)) / (u2 - u1))
    }
    crossings.sort((a, b) => a - b)
    for (let i = 0; i + 1 < crossings.length; i += 2) {
      const back = (v: number): Vertex => [(u - v) * Math.SQRT1_2, (u + v) * Math.SQRT1_2]
      lines.push([back(crossings[i] as number), back(crossings[i + 1] as number)])
    }
  }
  return lines
}

export interface PlaceOnLine {
  x: number
  y: number
  /** Direction of the line there, radians, y down. */
  angle: number
}

/** Length of a line up to each of its vertices. */
export function lengthsAlong(line: readonly Vertex[]): number[] {
  let sum = 0
  return line.map((vertex, k) => {
    const before = line[k - 1]
    if (before) sum += Math.hypot(vertex[0] - before[0], vertex[1] - before[1])
    return sum
  })
}

/** The place at a length along a line, with the line's direction there. */
export function placeAt(line: readonly Vertex[], lengths: readonly number[], length: number): PlaceOnLine {
  let k = 1
  while (k < line.length - 1 && (lengths[k] as number) < length) k++
  const [x, y] = line[k - 1] as Vertex
  const [toX, toY] = line[k] as Vertex
  const run = (lengths[k] as number) - (lengths[k - 1] as number)
  const t = run > 0 ? (length - (lengths[k - 1] as number)) / run : 0
  return { x: x + (toX - x) * t, y: y + (toY - y) * t, angle: Math.atan2(toY - y, toX - x) }
}

/** The part of a line between two lengths along it. */
export function partOf(
  line: readonly Vertex[],
  lengths: readonly number[],
  from: number,
  to: number,
): Vertex[] {
  const start = placeAt(line, lengths, from)
  const end = placeAt(line, lengths, to)
  const middle = line.filter((_, k) => (lengths[k] as number) > from && (lengths[k] as number) < to)
  return [[start.x, start.y], ...middle, [end.x, end.y]]
}

/**
 * Leaves out vertices that lie within `tolerance` pixels of the line without them (Douglas and Peucker, 1973), so that
 * a figure in a PDF is no larger than it looks.
 */
export function simplified(line: readonly Vertex[], tolerance: number): Vertex[] {
  if (line.length < 3) return [...line]
  const keep = new Uint8Array(line.length)
  keep[0] = 1
  keep[line.length - 1] = 1
  const spans: [number, number][] = [[0, line.length - 1]]
  for (let span = spans.pop(); span; span = spans.pop()) {
    const [from, to] = span
    const [x1, y1] = line[from] as Vertex
    const [x2, y2] = line[to] as Vertex
    const run = Math.hypot(x2 - x1, y2 - y1)
    let farthest = -1
    let most = tolerance
    for (let k = from + 1; k < to; k++) {
      const [x, y] = line[k] as Vertex
      const off =
        run > 0 ? Math.abs((x2 - x1) * (y1 - y) - (x1 - x) * (y2 - y1)) / run : Math.hypot(x - x1, y - y1)
      if (off > most) {
        most = off
        farthest = k
      }
    }
    if (farthest > 0) {
      keep[farthest] = 1
      spans.push([from, farthest], [farthest, to])
    }
  }
  return line.filter((_, k) => keep[k] === 1)
}

function digits(value: number): string {
  return String(Math.round(value * 10) / 10)
}

/** SVG path data of a line, or of a ring when `closed`. */
export function pathOf(line: readonly Vertex[], closed = false): string {
  const steps = line.map(([x, y], k) => `${k === 0 ? 'M' : 'L'}${digits(x)} ${digits(y)}`)
  return steps.join('') + (closed ? 'Z' : '')
}
