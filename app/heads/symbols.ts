import type { Vertex } from '~/book/field'
import { lengthsAlong, pathOf, placeAt } from './lines'
import type { Palette } from './palette'
import { cased, drawn, filled, pathOfCircle, type Shape } from './shapes'

/**
 * Drawing symbols as practice has them: a circled cross for a well, the inverted triangle on a water level, hatched
 * cut-off walls. All in pixels; `size` scales with the figure's type.
 */

/** Pixels that a well or an instrument reaches from its middle, for a figure whose type is 12 pixels high. */
export const symbolReach = 8

export function wellSymbol(
  x: number,
  y: number,
  kind: 'abstraction' | 'recharge',
  size: number,
  palette: Palette,
): Shape[] {
  const radius = 5.2 * size
  const arm = 8.4 * size
  const cross = `M${x - arm} ${y}H${x + arm}M${x} ${y - arm}V${y + arm}`
  const face = kind === 'recharge' ? palette.recharge : palette.face
  return [
    drawn(cross, palette.face, 3.4 * size, { lineCap: 'butt' }),
    drawn(pathOfCircle(x, y, radius), palette.face, 3.4 * size),
    filled(pathOfCircle(x, y, radius), face),
    drawn(pathOfCircle(x, y, radius), palette.edge, 1.5 * size),
    drawn(cross, palette.edge, 1.3 * size, { lineCap: 'butt' }),
  ]
}

/** An instrument: the water level's triangle standing on its point, over the line of the level. */
export function levelSymbol(
  x: number,
  y: number,
  size: number,
  palette: Palette,
  face = palette.face,
): Shape[] {
  const half = 5.6 * size
  const triangle = pathOf(
    [
      [x - half, y - 9 * size],
      [x + half, y - 9 * size],
      [x, y],
    ],
    true,
  )
  const level = `M${x - half} ${y + 1 * size}H${x + half}M${x - half * 0.5} ${y + 3.2 * size}H${x + half * 0.5}`
  return [
    drawn(triangle, palette.face, 3.6 * size),
    drawn(level, palette.face, 3.4 * size),
    filled(triangle, face),
    drawn(triangle, palette.edge, 1.4 * size, { lineJoin: 'miter' }),
    drawn(level, palette.edge, 1.2 * size, { lineCap: 'butt' }),
  ]
}

/** A named point: a small ring about a dot. */
export function pointSymbol(x: number, y: number, size: number, palette: Palette): Shape[] {
  const ring = pathOfCircle(x, y, 4 * size)
  return [
    drawn(ring, palette.face, 4 * size),
    filled(ring, palette.face),
    drawn(ring, palette.edge, 1.5 * size),
    filled(pathOfCircle(x, y, 1.3 * size), palette.edge),
  ]
}

export type BoundaryLook = 'fixed head' | 'specified flux' | 'head-dependent flux' | 'drain' | 'seepage face'

/** A boundary along a line. `towards` is the middle of the plot: flux arrows point that way, or back. */
export function boundarySymbol(
  line: readonly Vertex[],
  kind: BoundaryLook,
  size: number,
  palette: Palette,
  towards: Vertex,
): Shape[] {
  const data = pathOf(line)
  switch (kind) {
    case 'fixed head':
      return cased(data, palette.water, 3.6 * size, palette.casing)
    case 'head-dependent flux':
      return [
        ...cased(data, palette.water, 4.4 * size, palette.casing),
        drawn(data, palette.casing, 1.5 * size, { lineDash: [7 * size, 6 * size], lineCap: 'butt' }),
      ]
    case 'drain':
    case 'seepage face':
      return cased(data, palette.water, 2.6 * size, palette.casing, {
        lineDash: [9 * size, 5 * size],
        lineCap: 'butt',
      })
    case 'specified flux':
      return [
        ...cased(data, palette.flux, 2.4 * size, palette.casing),
        ...cased(fluxMarks(line, size, towards), palette.flux, 1.6 * size, palette.casing),
        drawn(data, palette.flux, 2.4 * size),
      ]
  }
}

function fluxMarks(line: readonly Vertex[], size: number, [towardsX, towardsY]: Vertex): string {
  const lengths = lengthsAlong(line)
  const total = lengths.at(-1) ?? 0
  const spacing = 26 * size
  const long = 8 * size
  let data = ''
  for (let at = spacing / 2; at < total; at += spacing) {
    const { x, y, angle } = placeAt(line, lengths, at)
    const left: Vertex = [-Math.sin(angle), Math.cos(angle)]
    const side = (towardsX - x) * left[0] + (towardsY - y) * left[1] >= 0 ? 1 : -1
    data += pathOf([
      [x, y],
      [x + left[0] * side * long, y + left[1] * side * long],
    ])
  }
  return data
}

/** A cut-off wall: a heavy line, hatched along one side. */
export function wallSymbol(line: readonly Vertex[], size: number, palette: Palette): Shape[] {
  const lengths = lengthsAlong(line)
  const total = lengths.at(-1) ?? 0
  const long = 6.5 * size
  let hatch = ''
  for (let at = 3.5 * size; at < total; at += 6.5 * size) {
    const { x, y, angle } = placeAt(line, lengths, at)
    const slant = angle - (3 * Math.PI) / 4
    hatch += pathOf([
      [x, y],
      [x + Math.cos(slant) * long, y + Math.sin(slant) * long],
    ])
  }
  return [
    drawn(hatch, palette.casing, 3 * size, { strokeOpacity: 0.7 }),
    ...cased(pathOf(line), palette.line, 3 * size, palette.casing, { lineCap: 'butt' }),
    drawn(hatch, palette.line, 1.2 * size, { lineCap: 'butt' }),
  ]
}

/** No-flow along a side of the extent: short hatches outside its frame. */
export function noFlowSymbol(
  from: Vertex,
  to: Vertex,
  outwards: number,
  size: number,
  palette: Palette,
): Shape {
  const run = Math.hypot(to[0] - from[0], to[1] - from[1])
  const along: Vertex = [(to[0] - from[0]) / run, (to[1] - from[1]) / run]
  const out: Vertex = [Math.cos(outwards), Math.sin(outwards)]
  const long = 5 * size
  let data = ''
  for (let at = long; at <= run; at += 7 * size) {
    const x = from[0] + along[0] * at
    const y = from[1] + along[1] * at
    data += pathOf([
      [x, y],
      [x - along[0] * long + out[0] * long, y - along[1] * long + out[1] * long],
    ])
  }
  return drawn(data, palette.quiet, 1, { lineCap: 'butt' })
}
