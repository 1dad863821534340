import { polygon, polyline, type Vertex } from '~/book/field'

/** What a drawing of the site can show. */
export type DrawnKind =
  | 'well'
  | 'recharge zone'
  | 'boundary'
  | 'wall'
  | 'zone'
  | 'point'
  | 'instrument'
  | 'extent'

export type DrawnGeometry =
  | { type: 'point'; at: Vertex }
  | { type: 'line'; vertices: Vertex[] }
  | { type: 'polygon'; vertices: Vertex[] }

/** What decides a symbol besides the kind. */
export interface DrawnDetail {
  wellKind?: 'abstraction' | 'recharge'
  boundaryKind?: 'fixed head' | 'specified flux' | 'head-dependent flux' | 'drain'
  /** Zones of one material share a tint: 0, 1, 2 … in the order of the materials. */
  tint?: number
}

/** One row as drawn. Coordinates are the project's; a polygon's last vertex is not its first again. */
export interface DrawnFeature {
  id: string
  kind: DrawnKind
  label: string
  geometry: DrawnGeometry
  detail?: DrawnDetail
  /** Shown for orientation only: paler, neither selected nor changed. */
  muted?: boolean
}

export type Extent = readonly [xMin: number, yMin: number, xMax: number, yMax: number]

/** The form of geometry that a kind of row has. */
export function shapeOf(kind: DrawnKind): DrawnGeometry['type'] {
  switch (kind) {
    case 'well':
    case 'point':
    case 'instrument':
      return 'point'
    case 'boundary':
    case 'wall':
      return 'line'
    case 'recharge zone':
    case 'zone':
    case 'extent':
      return 'polygon'
  }
}

export function verticesOf(geometry: DrawnGeometry): Vertex[] {
  return geometry.type === 'point' ? [geometry.at] : geometry.vertices
}

/** Geometry of a kind through these vertices; for a point the first one counts. */
export function geometryOf(type: DrawnGeometry['type'], vertices: Vertex[]): DrawnGeometry | null {
  if (type !== 'point') return { type, vertices }
  const at = vertices[0]
  return at ? { type, at } : null
}

/** Why this geometry cannot stand, in words, or null. */
export function geometryProblem(geometry: DrawnGeometry): string | null {
  if (geometry.type === 'point') {
    return geometry.at.every(Number.isFinite) ? null : 'A coordinate is needed.'
  }
  const checked = (geometry.type === 'line' ? polyline : polygon).safeParse(geometry.vertices)
  return checked.success ? null : (checked.error.issues[0]?.message ?? 'This geometry cannot stand.')
}

/** The rectangle about all vertices, or null where there are none. */
export function extentAbout(geometries: readonly DrawnGeometry[]): Extent | null {
  let [xMin, yMin, xMax, yMax] = [
    Number.POSITIVE_INFINITY,
    Number.POSITIVE_INFINITY,
    Number.NEGATIVE_INFINITY,
    Number.NEGATIVE_INFINITY,
  ]
  for (const geometry of geometries) {
    for (const [x, y] of verticesOf(geometry)) {
      xMin = Math.min(xMin, x)
      yMin = Math.min(yMin, y)
      xMax = Math.max(xMax, x)
      yMax = Math.max(yMax, y)
    }
  }
  return xMin <= xMax ? [xMin, yMin, xMax, yMax] : null
}

/** Decimals that a position picked by hand deserves, where one pixel spans `resolution` units of length. */
export function decimalsAt(resolution: number): number {
  return Math.max(0, Math.min(3, Math.ceil(-Math.log10(resolution))))
}

/**
 * Rounds vertices picked by hand, but leaves those that lie on a known vertex (snapped to, or not moved) exactly there.
 */
export function roundedVertices(
  vertices: readonly Vertex[],
  decimals: number,
  known: readonly Vertex[],
): Vertex[] {
  const near = 10 ** -(decimals + 4)
  return vertices.map(([x, y]) => {
    const exact = known.find(([u, v]) => Math.abs(u - x) <= near && Math.abs(v - y) <= near)
    return exact ? [exact[0], exact[1]] : [Number(x.toFixed(decimals)), Number(y.toFixed(decimals))]
  })
}

/** Moves all vertices by one step, itself rounded, so that a shape keeps its form. */
export function movedVertices(
  before: readonly Vertex[],
  after: readonly Vertex[],
  decimals: number,
): Vertex[] {
  const [from, to] = [before[0], after[0]]
  if (!from || !to) return []
  const dx = Number((to[0] - from[0]).toFixed(decimals))
  const dy = Number((to[1] - from[1]).toFixed(decimals))
  // Six decimals keep a sum such as 0.1 + 0.2 from growing a tail.
  return before.map(([x, y]) => [Number((x + dx).toFixed(6)), Number((y + dy).toFixed(6))])
}

/** The longest of 1, 2 or 5 times a power of ten that is not longer than this. */
export function roundLength(longest: number): number {
  const power = 10 ** Math.floor(Math.log10(longest))
  const step = [5, 2, 1].find((size) => size * power <= longest * (1 + 1e-9)) ?? 1
  return step * power
}

/**
 * Short strokes across a line at 45 degrees: the hatch of a cut-off wall. `spacing` and `reach` are
 * in the coordinates' unit; at most `most` strokes, spread wider where the line is longer.
 */
export function hatchStrokes(
  vertices: readonly Vertex[],
  spacing: number,
  reach: number,
  most = 1500,
): [Vertex, Vertex][] {
  let total = 0
  for (let i = 1; i < vertices.length; i++) {
    const [a, b] = [vertices[i - 1] as Vertex, vertices[i] as Vertex]
    total += Math.hypot(b[0] - a[0], b[1] - a[1])
  }
  const step = Math.max(spacing, total / most)
  const strokes: [Vertex, Vertex][] = []
  let next = step / 2
  for (let i = 1; i < vertices.length; i++) {
    const [a, b] = [vertices[i - 1] as Vertex, vertices[i] as Vertex]
    const length = Math.hypot(b[0] - a[0], b[1] - a[1])
    if (length === 0) continue
    const [ux, uy] = [(b[0] - a[0]) / length, (b[1] - a[1]) / length]
    while (next <= length) {
      const [x, y] = [a[0] + ux * next, a[1] + uy * next]
      strokes.push([
        [x - (ux + uy) * reach, y - (uy - ux) * reach],
        [x + (ux + uy) * reach, y + (uy - ux) * reach],
      ])
      next += step
    }
    next -= length
  }
  return strokes
}
