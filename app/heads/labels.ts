import type { Vertex } from '~/book/field'
import { type Box, boxAlong, boxOf, liesWithin, overlap, typeWidth } from './boxes'
import { lengthsAlong, type PlaceOnLine, placeAt, type Rectangle } from './lines'

/** What is already taken in a figure: labels look for room among these. */
export type Taken = Box[]

function isFree(box: Box, taken: Taken): boolean {
  return !taken.some((other) => overlap(box, other))
}

/** Type never stands on its head: the angle that reads from the bottom or the right of the sheet. */
export function upright(angle: number): number {
  let turned = angle
  while (turned > Math.PI / 2) turned -= Math.PI
  while (turned <= -Math.PI / 2) turned += Math.PI
  return turned
}

export interface LineLabel {
  text: string
  box: Box
  /** Lengths along the line between which the label stands: the line is broken there. */
  from: number
  to: number
}

const step = 6
/** Least distance between two labels of one contour, pixels. */
const apart = 300

/**
 * Places for a contour's label along its line: where it bends least, leaning little, away from everything taken, and
 * wholly inside the plot. A long contour gets several; a short ring, or one in a crowd, none. Adds what it places to
 * `taken`. `suits` may refuse a place for reasons of the field (another contour in the way, no heads there).
 */
export function labelsAlong(
  line: readonly Vertex[],
  options: {
    text: string
    size: number
    plot: Rectangle
    taken: Taken
    suits: (box: Box) => boolean
  },
): LineLabel[] {
  const { text, size, plot, taken, suits } = options
  const width = typeWidth(text, size, true) + 6
  const height = size * 1.15
  const lengths = lengthsAlong(line)
  const total = lengths.at(-1) ?? 0
  if (total < width * 2.2) return []
  const candidates: { place: PlaceOnLine; at: number; cost: number }[] = []
  for (let at = width * 0.8; at <= total - width * 0.8; at += step) {
    const start = placeAt(line, lengths, at - width / 2)
    const end = placeAt(line, lengths, at + width / 2)
    const middle = placeAt(line, lengths, at)
    const chord = Math.hypot(end.x - start.x, end.y - start.y)
    if (chord < width * 0.9) continue
    const angle = Math.atan2(end.y - start.y, end.x - start.x)
    const bend = Math.abs((middle.x - start.x) * Math.sin(angle) - (middle.y - start.y) * Math.cos(angle))
    if (bend > size * 0.35) continue
    const lean = Math.abs(upright(angle)) / (Math.PI / 2)
    candidates.push({
      place: { ...middle, angle: upright(angle) },
      at,
      cost: bend / size + lean * 0.6 + Math.abs(at / total - 0.5) * 0.5,
    })
  }
  candidates.sort((a, b) => a.cost - b.cost)
  const placed: LineLabel[] = []
  for (const { place, at } of candidates) {
    if (placed.some((label) => Math.abs((label.from + label.to) / 2 - at) < apart)) continue
    const box = boxOf(place.x, place.y, width, height, place.angle)
    if (!liesWithin(box, plot) || !isFree(box, taken) || !suits(box)) continue
    taken.push(box)
    placed.push({ text, box, from: at - width / 2, to: at + width / 2 })
  }
  return placed
}

export interface NamePlace {
  box: Box
  /** From the symbol to a name that found room only further off. */
  leader: [Vertex, Vertex] | null
}

/**
 * Room for a name beside a symbol: the first free place of eight round it; in a crowd one further off, with a leader;
 * failing that, the place that covers least.
 */
export function nameBeside(
  x: number,
  y: number,
  text: string,
  options: { size: number; clear: number; plot: Rectangle; taken: Taken },
): NamePlace {
  const { size, clear, plot, taken } = options
  const width = typeWidth(text, size, true) + 5
  const height = size * 1.2
  const across = clear + width / 2
  const over = clear + height / 2 - 1
  const slant = 0.72
  const places: [number, number][] = [
    [across, 0],
    [-across, 0],
    [0, -over],
    [0, over],
    [across * slant + clear * 0.3, -over * slant],
    [across * slant + clear * 0.3, over * slant],
    [-across * slant - clear * 0.3, -over * slant],
    [-across * slant - clear * 0.3, over * slant],
  ]
  const near = places.map(([dx, dy]) => boxOf(x + dx, y + dy, width, height))
  const covers = (box: Box) =>
    taken.filter((other) => overlap(box, other)).length + (liesWithin(box, plot) ? 0 : 100)
  const beside = near.find((box) => covers(box) === 0)
  if (beside) {
    taken.push(beside)
    return { box: beside, leader: null }
  }
  for (const reach of [1.5, 2.2, 3]) {
    for (let k = 0; k < 16; k++) {
      const angle = (k * Math.PI) / 8
      const box = boxOf(
        x + Math.cos(angle) * (clear * reach + width / 2),
        y + Math.sin(angle) * (clear * reach + height),
        width,
        height,
      )
      if (covers(box) > 0) continue
      const away = Math.hypot(box.x - x, box.y - y)
      const start: Vertex = [x + ((box.x - x) * clear * 0.8) / away, y + ((box.y - y) * clear * 0.8) / away]
      taken.push(box, boxAlong(start, [box.x, box.y], 2))
      return { box, leader: [start, [box.x, box.y]] }
    }
  }
  const least = near.reduce((a, b) => (covers(b) < covers(a) ? b : a))
  taken.push(least)
  return { box: least, leader: null }
}

/** Room for a name along a line, beside it or, failing that, on it; undefined when there is none. */
export function nameAlong(
  line: readonly Vertex[],
  text: string,
  options: { size: number; clear: number; plot: Rectangle; taken: Taken },
): Box | undefined {
  const { size, clear, plot, taken } = options
  const width = typeWidth(text, size, true) + 6
  const height = size * 1.2
  const lengths = lengthsAlong(line)
  const total = lengths.at(-1) ?? 0
  const shares = [0.5, 0.38, 0.62, 0.26, 0.74, 0.15, 0.85]
  for (const side of [1, -1, 0]) {
    for (const share of shares) {
      const place = placeAt(line, lengths, share * total)
      const start = placeAt(line, lengths, share * total - width / 2)
      const end = placeAt(line, lengths, share * total + width / 2)
      const angle = upright(Math.atan2(end.y - start.y, end.x - start.x))
      const off = side * (clear + height / 2)
      const box = boxOf(
        place.x + off * Math.sin(angle),
        place.y - off * Math.cos(angle),
        width,
        height,
        angle,
      )
      if (!liesWithin(box, plot) || !isFree(box, taken)) continue
      taken.push(box)
      return box
    }
  }
  return undefined
}

/** Room for a name inside an area: near its corners and middle, wherever is free. */
export function nameInside(
  ring: readonly Vertex[],
  text: string,
  options: { size: number; plot: Rectangle; taken: Taken },
): Box | undefined {
  const { size, plot, taken } = options
  const width = typeWidth(text, size, true) + 6
  const height = size * 1.2
  const left = Math.min(...ring.map(([x]) => x))
  const right = Math.max(...ring.map(([x]) => x))
  const top = Math.min(...ring.map(([, y]) => y))
  const bottom = Math.max(...ring.map(([, y]) => y))
  const middleX = (left + right) / 2
  const inset = 4
  const heights = [
    top + inset + height / 2,
    (top + bottom) / 2,
    bottom - inset - height / 2,
    top - height / 2 - 3,
  ]
  for (const y of heights) {
    for (const x of [middleX, left + inset + width / 2, right - inset - width / 2]) {
      const box = boxOf(x, y, width, height)
      if (!liesWithin(box, plot) || !isFree(box, taken)) continue
      taken.push(box)
      return box
    }
  }
  return undefined
}
