import { faceBetweenColumns, faceBetweenRows, faceOf, facesOfCell } from './faces'
import { centresOf, type Grid, intervalOf } from './grid'
import type { Position } from './model'
import { ModelError, requireFinite } from './model-error'

/** Lines closer to a grid line than this share of a cell lie on it. */
const onGridLine = 1e-6

/** A place along a line: `segment` counts from 0, `t` runs 0..1 along it. */
export interface Along {
  segment: number
  t: number
}

/** A face that separates the two sides of a line. `share`: the covered part of the face, 0..1. */
export interface CrossedFace {
  face: number
  share: number
  at: Along
  /** 1 when the left of the line is on the face's high side, else -1. */
  left: 1 | -1
}

/** A piece of a line: its length, its middle, and the cell or the grid line it lies in. */
export interface LinePiece {
  length: number
  at: Along
  middle: [x: number, y: number]
  /** The cell the piece lies in, or -1 when outside the extent or on a grid line. */
  cell: number
  /** The face the piece lies on, or -1. */
  face: number
}

/** Refuses a line with fewer than two vertices, numbers that are not finite, or no length. */
export function checkLine(line: Position[], path: string): void {
  if (line.length < 2) throw new ModelError(path, 'a line needs at least two vertices')
  line.forEach((vertex, index) => {
    requireFinite(vertex[0], `${path}[${index}][0]`)
    requireFinite(vertex[1], `${path}[${index}][1]`)
  })
  if (lineLength(line) === 0) throw new ModelError(path, 'the line has no length')
}

/** Length of a line through its vertices, in their unit. */
export function lineLength(line: Position[]): number {
  let length = 0
  for (let s = 0; s + 1 < line.length; s++) length += segmentLength(line, s)
  return length
}

export function segmentLength(line: Position[], segment: number): number {
  const [a, b] = endsOf(line, segment)
  return Math.hypot(b[0] - a[0], b[1] - a[1])
}

function endsOf(line: Position[], segment: number): [Position, Position] {
  return [line[segment] as Position, line[segment + 1] as Position]
}

/** The value at a place along a line: one value for all, or one a vertex, linear by length between. */
export function valueAlong(value: number | number[], at: Along): number {
  if (typeof value === 'number') return value
  const a = value[at.segment] as number
  const b = value[at.segment + 1] as number
  return a + at.t * (b - a)
}

/**
 * The faces a line separates: those whose two cell centres lie on either side of it. A closed line or one from edge to
 * edge is tight by construction (the links between centres that it crosses separate its sides, as a curve in the plane
 * does). An end on an axis-parallel segment covers its last face in proportion, when `proportionalEnds` says so.
 *
 * The line is shifted by a millionth of a cell, so that a line through centres has them all on one side.
 */
export function crossedFaces(
  grid: Grid,
  line: Position[],
  proportionalEnds: [start: boolean, end: boolean],
): CrossedFace[] {
  const xCentres = centresOf(grid.xEdges)
  const yCentres = centresOf(grid.yEdges)
  const shiftX = 1e-6 * smallestStep(grid.xEdges)
  const shiftY = 0.7e-6 * smallestStep(grid.yEdges)
  const crossed = new Map<number, CrossedFace>()
  // A line that doubles back over a link has not separated its ends: such a face is crossed twice and drops out.
  function toggle(entry: CrossedFace): void {
    if (crossed.has(entry.face)) crossed.delete(entry.face)
    else crossed.set(entry.face, entry)
  }
  for (let s = 0; s + 1 < line.length; s++) {
    const [p, q] = endsOf(line, s)
    const a: Position = [p[0] + shiftX, p[1] + shiftY]
    const b: Position = [q[0] + shiftX, q[1] + shiftY]
    visitBetween(yCentres, a[1], b[1], (j) => {
      const t = ((yCentres[j] as number) - a[1]) / (b[1] - a[1])
      const i = intervalOf(xCentres, a[0] + t * (b[0] - a[0])) + 1
      toggle({
        face: faceBetweenColumns(grid, i, j),
        share: 1,
        at: { segment: s, t },
        left: b[1] > a[1] ? -1 : 1,
      })
    })
    visitBetween(xCentres, a[0], b[0], (i) => {
      const t = ((xCentres[i] as number) - a[0]) / (b[0] - a[0])
      const j = intervalOf(yCentres, a[1] + t * (b[1] - a[1])) + 1
      toggle({
        face: faceBetweenRows(grid, i, j),
        share: 1,
        at: { segment: s, t },
        left: b[0] > a[0] ? 1 : -1,
      })
    })
  }
  const first = line[0] as Position
  const last = line[line.length - 1] as Position
  if (first[0] === last[0] && first[1] === last[1]) return [...crossed.values()]
  if (proportionalEnds[0]) coverEnd(grid, line, 0, xCentres, yCentres, crossed)
  if (proportionalEnds[1]) coverEnd(grid, line, line.length - 1, xCentres, yCentres, crossed)
  return [...crossed.values()]
}

function coverEnd(
  grid: Grid,
  line: Position[],
  vertex: number,
  xCentres: Float64Array,
  yCentres: Float64Array,
  crossed: Map<number, CrossedFace>,
): void {
  const segment = vertex === 0 ? 0 : vertex - 1
  const [a, b] = endsOf(line, segment)
  const end = line[vertex] as Position
  const along = axisOf(grid, a, b)
  if (along === null) return
  const edges = along === 1 ? grid.yEdges : grid.xEdges
  const k = intervalOf(edges, end[along])
  if (k < 0 || k >= edges.length - 1) return
  const low = edges[k] as number
  const high = edges[k + 1] as number
  const share =
    (Math.min(high, Math.max(a[along], b[along])) - Math.max(low, Math.min(a[along], b[along]))) /
    (high - low)
  const across = along === 1 ? 0 : 1
  const centres = along === 1 ? xCentres : yCentres
  const n =
    intervalOf(centres, end[across] + 1e-6 * smallestStep(along === 1 ? grid.xEdges : grid.yEdges)) + 1
  const face = along === 1 ? faceBetweenColumns(grid, n, k) : faceBetweenRows(grid, k, n)
  if (share <= onGridLine) {
    crossed.delete(face)
    return
  }
  const rising = b[along] > a[along]
  const left = along === 1 ? (rising ? -1 : 1) : rising ? 1 : -1
  crossed.set(face, { face, share: Math.min(1, share), at: { segment, t: vertex === 0 ? 0 : 1 }, left })
}

/** 0 when the segment runs along x, 1 along y, null when it does neither. */
function axisOf(grid: Grid, a: Position, b: Position): 0 | 1 | null {
  if (Math.abs(a[1] - b[1]) <= onGridLine * smallestStep(grid.yEdges)) return 0
  if (Math.abs(a[0] - b[0]) <= onGridLine * smallestStep(grid.xEdges)) return 1
  return null
}

function visitBetween(centres: Float64Array, from: number, to: number, visit: (index: number) => void): void {
  if (from === to) return
  const low = Math.min(from, to)
  const high = Math.max(from, to)
  for (let k = intervalOf(centres, low) + 1; k < centres.length && (centres[k] as number) <= high; k++) {
    if ((centres[k] as number) > low) visit(k)
  }
}

function smallestStep(edges: Float64Array): number {
  let step = Number.POSITIVE_INFINITY
  for (let k = 0; k + 1 < edges.length; k++)
    step = Math.min(step, (edges[k + 1] as number) - (edges[k] as number))
  return step
}

/** The line cut at every grid line it crosses. Pieces along a grid line carry its face, the others their cell. */
export function linePieces(grid: Grid, line: Position[]): LinePiece[] {
  const pieces: LinePiece[] = []
  for (let s = 0; s + 1 < line.length; s++) {
    const [a, b] = endsOf(line, s)
    const length = segmentLength(line, s)
    if (length === 0) continue
    const along = axisOf(grid, a, b)
    const onLine =
      along === null ? -1 : gridLineAt(along === 1 ? grid.xEdges : grid.yEdges, a[along === 1 ? 0 : 1])
    const cuts = [0, ...cutsOf(grid.xEdges, a[0], b[0]), ...cutsOf(grid.yEdges, a[1], b[1]), 1].sort(
      (p, q) => p - q,
    )
    for (let k = 0; k + 1 < cuts.length; k++) {
      const from = cuts[k] as number
      const to = cuts[k + 1] as number
      if ((to - from) * length < 1e-12 * length) continue
      const t = (from + to) / 2
      const middle: [number, number] = [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])]
      const i = insideInterval(grid.xEdges, middle[0])
      const j = insideInterval(grid.yEdges, middle[1])
      const piece: LinePiece = {
        length: (to - from) * length,
        at: { segment: s, t },
        middle,
        cell: -1,
        face: -1,
      }
      if (onLine >= 0) {
        if (along === 1 && j >= 0) piece.face = faceBetweenColumns(grid, onLine, j)
        if (along === 0 && i >= 0) piece.face = faceBetweenRows(grid, i, onLine)
      } else if (i >= 0 && j >= 0) piece.cell = j * grid.columns + i
      pieces.push(piece)
    }
  }
  return pieces
}

function cutsOf(edges: Float64Array, from: number, to: number): number[] {
  const cuts: number[] = []
  if (from === to) return cuts
  const low = Math.min(from, to)
  const high = Math.max(from, to)
  for (let k = intervalOf(edges, low); k < edges.length && (edges[Math.max(k, 0)] as number) < high; k++) {
    if (k < 0) continue
    const t = ((edges[k] as number) - from) / (to - from)
    if (t > 0 && t < 1) cuts.push(t)
  }
  return cuts
}

function gridLineAt(edges: Float64Array, value: number): number {
  const tolerance = onGridLine * smallestStep(edges)
  const k = intervalOf(edges, value)
  if (k >= 0 && Math.abs((edges[k] as number) - value) <= tolerance) return k
  if (k + 1 < edges.length && Math.abs((edges[k + 1] as number) - value) <= tolerance) return k + 1
  return -1
}

function insideInterval(edges: Float64Array, value: number): number {
  const k = intervalOf(edges, value)
  return k >= 0 && k < edges.length - 1 ? k : -1
}

/** Where a line stands on the model: on faces along its edge, and in the cells it crosses inside. */
export interface LinePlacement {
  /** Faces with ground on one side only: the covered share, and the true length of line that they stand for. */
  faces: { face: number; cell: number; share: number; length: number; at: Along }[]
  /** Cells crossed inside, with the length of line in each. */
  cells: { cell: number; length: number; at: Along }[]
  /** Length of line that touches no active cell. */
  lost: number
}

/**
 * Places a boundary line. Along an edge of the extent or of a hole it acts at the faces; a sloping edge of a hole is
 * followed face by face and the true length shared among them by their projection on the line. Elsewhere it acts on
 * the cells it crosses, along interior faces half and half.
 */
export function placeLine(grid: Grid, active: Uint8Array, line: Position[]): LinePlacement {
  const placement: LinePlacement = { faces: [], cells: [], lost: 0 }
  const sloping: LinePiece[] = []
  let slopingLength = 0
  for (const piece of linePieces(grid, line)) {
    if (piece.face >= 0) {
      const { low, high, length } = faceOf(grid, piece.face)
      const lowActive = low >= 0 && active[low] === 1
      const highActive = high >= 0 && active[high] === 1
      if (lowActive && highActive) {
        placement.cells.push({ cell: low, length: piece.length / 2, at: piece.at })
        placement.cells.push({ cell: high, length: piece.length / 2, at: piece.at })
      } else if (lowActive || highActive) {
        const cell = lowActive ? low : high
        const share = Math.min(1, piece.length / length)
        placement.faces.push({ face: piece.face, cell, share, length: piece.length, at: piece.at })
      } else placement.lost += piece.length
    } else if (piece.cell < 0) placement.lost += piece.length
    else if (followsHoleEdge(grid, active, line, piece)) {
      sloping.push(piece)
      slopingLength += piece.length
    } else if (active[piece.cell] === 1) {
      placement.cells.push({ cell: piece.cell, length: piece.length, at: piece.at })
    } else placement.lost += piece.length
  }
  if (sloping.length > 0) placeSloping(grid, active, line, sloping, slopingLength, placement)
  return placement
}

function placeSloping(
  grid: Grid,
  active: Uint8Array,
  line: Position[],
  pieces: LinePiece[],
  total: number,
  placement: LinePlacement,
): void {
  const segments = new Set(pieces.map((piece) => piece.at.segment))
  const found: { face: number; cell: number; share: number; weight: number; at: Along }[] = []
  for (const crossing of crossedFaces(grid, line, [true, true])) {
    const face = faceOf(grid, crossing.face)
    if (face.low < 0 || face.high < 0 || active[face.low] === active[face.high]) continue
    // Neighbouring segments of a finely drawn curve count too: one of them alone may cross no link between centres.
    const near = [-1, 0, 1].some((step) => segments.has(crossing.at.segment + step))
    if (!near || !nearPieces(grid, pieces, face.middle)) continue
    const [a, b] = endsOf(line, crossing.at.segment)
    const length = Math.hypot(b[0] - a[0], b[1] - a[1])
    const cosine = Math.abs(face.axis === 'x' ? b[1] - a[1] : b[0] - a[0]) / length
    const weight = face.length * crossing.share * cosine
    const cell = active[face.low] === 1 ? face.low : face.high
    found.push({ face: crossing.face, cell, share: crossing.share, weight, at: crossing.at })
  }
  const weights = found.reduce((sum, entry) => sum + entry.weight, 0)
  if (weights > 0) {
    for (const { weight, ...entry } of found) {
      placement.faces.push({ ...entry, length: (total * weight) / weights })
    }
    return
  }
  for (const piece of pieces) {
    if (active[piece.cell] === 1)
      placement.cells.push({ cell: piece.cell, length: piece.length, at: piece.at })
    else placement.lost += piece.length
  }
}

function nearPieces(grid: Grid, pieces: LinePiece[], [x, y]: [number, number]): boolean {
  return pieces.some((piece) => {
    const [width, height] = cellSize(grid, piece.cell)
    return Math.abs(piece.middle[0] - x) <= 1.5 * width && Math.abs(piece.middle[1] - y) <= 1.5 * height
  })
}

function cellSize(grid: Grid, cell: number): [width: number, height: number] {
  const j = Math.floor(cell / grid.columns)
  const i = cell - j * grid.columns
  return [
    (grid.xEdges[i + 1] as number) - (grid.xEdges[i] as number),
    (grid.yEdges[j + 1] as number) - (grid.yEdges[j] as number),
  ]
}

/** Is there ground on one side of the piece and a hole, inside the extent, on the other? */
function followsHoleEdge(grid: Grid, active: Uint8Array, line: Position[], piece: LinePiece): boolean {
  const [a, b] = endsOf(line, piece.at.segment)
  const length = Math.hypot(b[0] - a[0], b[1] - a[1])
  const normal: [number, number] = [-(b[1] - a[1]) / length, (b[0] - a[0]) / length]
  const [width, height] = cellSize(grid, piece.cell)
  const reach = 0.75 * (Math.abs(normal[0]) * width + Math.abs(normal[1]) * height)
  const sides = [1, -1].map((side) => {
    const i = insideInterval(grid.xEdges, piece.middle[0] + side * reach * normal[0])
    const j = insideInterval(grid.yEdges, piece.middle[1] + side * reach * normal[1])
    // Beyond the extent there is no ground; whether the line follows a hole there, the cells beside it say.
    return i < 0 || j < 0 ? null : active[j * grid.columns + i] === 1
  })
  if (sides[0] !== null && sides[1] !== null) return sides[0] !== sides[1]
  return (sides[0] === true || sides[1] === true) && touchesHole(grid, active, piece.cell)
}

function touchesHole(grid: Grid, active: Uint8Array, cell: number): boolean {
  if (active[cell] !== 1) return true
  return facesOfCell(grid, cell).some((face) => {
    const { low, high } = faceOf(grid, face)
    const other = low === cell ? high : low
    return other >= 0 && active[other] !== 1
  })
}
