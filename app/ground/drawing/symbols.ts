import type Feature from 'ol/Feature.js'
import LineString from 'ol/geom/LineString.js'
import MultiLineString from 'ol/geom/MultiLineString.js'
import MultiPoint from 'ol/geom/MultiPoint.js'
import Point from 'ol/geom/Point.js'
import Circle from 'ol/style/Circle.js'
import Fill from 'ol/style/Fill.js'
import Icon from 'ol/style/Icon.js'
import RegularShape from 'ol/style/RegularShape.js'
import Stroke from 'ol/style/Stroke.js'
import Style from 'ol/style/Style.js'
import Text from 'ol/style/Text.js'
import type { Vertex } from '~/book/field'
import { type DrawnFeature, hatchStrokes, verticesOf } from './drawn-feature'
import { type Paint, type Palette, paint } from './palette'
import { type LabelSide, type LinePlace, labelOffset } from './place-labels'

export interface Look {
  palette: Palette
  selectedId: string | null
  hoveredId: string | null
  /** Shows the vertices of the selected row as handles. */
  handles: boolean
  fontSize: number
  /** 1, or less where symbols crowd. */
  symbolScale: number
  /** Where a point's label has room of its own, or null. */
  side: (id: string) => LabelSide | null
  /** The room along a line for its label, in pixels at this scale (y downwards), or null. */
  along: (id: string) => LinePlace | null
}

/** Half the size of a point symbol in pixels, at its full scale. */
export const symbolReach = 10

export function drawnOf(feature: Feature): DrawnFeature {
  return feature.get('drawn') as DrawnFeature
}

const rank: Record<DrawnFeature['kind'], number> = {
  zone: 1,
  'recharge zone': 2,
  extent: 3,
  boundary: 4,
  wall: 5,
  point: 6,
  instrument: 7,
  well: 8,
}

/**
 * The order of drawing is also the order of precedence, from the top, in which labels find room: the label of a
 * chosen symbol (300), symbols (260), labels (200), lines and areas below. So a label gives way to a symbol, never the reverse.
 */

/** The styles of one drawn row: ground lines, symbol, label, and the glow of what is selected or pointed at. */
export function stylesFor(feature: Feature, resolution: number, look: Look): Style[] {
  const drawn = drawnOf(feature)
  const selected = drawn.id === look.selectedId
  const hovered = drawn.id === look.hoveredId
  const zIndex =
    drawn.geometry.type === 'point' ? 260 + rank[drawn.kind] : rank[drawn.kind] * 10 + (selected ? 100 : 0)
  const styles: Style[] = []
  if (selected || hovered) styles.push(...glow(drawn, look.palette, selected, zIndex - 1))
  styles.push(...shapeStyles(drawn, resolution, look, zIndex))
  const label = labelStyle(drawn, resolution, look, selected || hovered)
  if (label) styles.push(label)
  if (selected && look.handles && drawn.geometry.type !== 'point') {
    styles.push(
      new Style({
        geometry: new MultiPoint(verticesOf(drawn.geometry)),
        image: handle(look.palette),
        zIndex: 320,
      }),
    )
  }
  return styles
}

/** A vertex that can be taken hold of. */
export function handle(palette: Palette): RegularShape {
  return new RegularShape({
    points: 4,
    radius: 6.5,
    angle: Math.PI / 4,
    fill: new Fill({ color: paint(palette.chalk) }),
    stroke: new Stroke({ color: paint(palette.bourne), width: 2 }),
    declutterMode: 'none',
  })
}

/** Lines, areas and points while they are being drawn or measured. */
export function sketchStyles(palette: Palette): Style[] {
  return [
    new Style({
      fill: new Fill({ color: paint(palette.bourne, 0.12) }),
      stroke: new Stroke({ color: paint(palette.chalk), width: 5 }),
    }),
    new Style({ stroke: new Stroke({ color: paint(palette.bourne), width: 2, lineDash: [6, 4] }) }),
    new Style({
      image: new Circle({
        radius: 5.5,
        fill: new Fill({ color: paint(palette.chalk) }),
        stroke: new Stroke({ color: paint(palette.bourne), width: 2 }),
      }),
    }),
  ]
}

function glow(drawn: DrawnFeature, palette: Palette, selected: boolean, zIndex: number): Style[] {
  const colour = paint(palette.bourne, selected ? 0.38 : 0.2)
  if (drawn.geometry.type === 'point') {
    return [
      new Style({
        image: new Circle({
          radius: selected ? 15 : 14,
          fill: new Fill({ color: colour }),
          declutterMode: 'none',
        }),
        zIndex,
      }),
    ]
  }
  return [new Style({ stroke: new Stroke({ color: colour, width: selected ? 12 : 9 }), zIndex })]
}

function shapeStyles(drawn: DrawnFeature, resolution: number, look: Look, zIndex: number): Style[] {
  const { palette } = look
  const faint = drawn.muted ? 0.5 : 1
  switch (drawn.kind) {
    case 'well':
    case 'instrument':
    case 'point':
      return [new Style({ image: symbolImage(drawn, look), zIndex })]
    case 'zone': {
      const tints: Paint[] = [palette.ochre, palette.moss, palette.bourne, palette.madder, palette.flint]
      const tint = tints[(drawn.detail?.tint ?? 0) % tints.length] as Paint
      return [
        new Style({
          fill: new Fill({ color: paint(tint, 0.1 * faint) }),
          stroke: new Stroke({ color: paint(tint, 0.75 * faint), width: 1 }),
          zIndex,
        }),
      ]
    }
    case 'recharge zone':
      return [
        new Style({
          fill: new Fill({ color: hatch(paint(palette.bourne, 0.5 * faint)) }),
          stroke: new Stroke({ color: paint(palette.bourne, faint), width: 1.3, lineDash: [6, 4] }),
          zIndex,
        }),
      ]
    case 'extent':
      return [
        new Style({
          stroke: new Stroke({
            color: paint(palette['flint-2'], faint),
            width: 1.2,
            lineDash: [14, 4, 3, 4],
          }),
          zIndex,
        }),
      ]
    case 'boundary':
      return boundaryStrokes(drawn.detail?.boundaryKind ?? 'fixed head', palette, faint).map(
        (stroke, i) => new Style({ stroke, zIndex: zIndex + i / 10 }),
      )
    case 'wall':
      return wallStyles(drawn, resolution, palette, faint, zIndex)
  }
}

function boundaryStrokes(
  kind: 'fixed head' | 'specified flux' | 'head-dependent flux' | 'drain',
  palette: Palette,
  faint: number,
): Stroke[] {
  const blue = paint(palette.bourne, faint)
  const paper = paint(palette.chalk, faint)
  switch (kind) {
    // A broad line with a pale dash in it: the level is held.
    case 'fixed head':
      return [
        new Stroke({ color: blue, width: 5.5, lineCap: 'butt' }),
        new Stroke({ color: paper, width: 1.6, lineDash: [9, 6], lineCap: 'butt' }),
      ]
    // Two thin lines with a gap: water passes through a resistance.
    case 'head-dependent flux':
      return [
        new Stroke({ color: blue, width: 6, lineDash: [16, 5], lineCap: 'butt' }),
        new Stroke({ color: paper, width: 3, lineDash: [16, 5], lineCap: 'butt' }),
      ]
    // A dash and two dots.
    case 'specified flux':
      return [new Stroke({ color: blue, width: 3.2, lineDash: [14, 5, 3, 5, 3, 5], lineCap: 'butt' })]
    // A row of dots, as a drain pipe has perforations.
    case 'drain':
      return [
        new Stroke({ color: paper, width: 6.5, lineCap: 'round' }),
        new Stroke({ color: paint(palette.ochre, faint), width: 5, lineDash: [0.1, 9], lineCap: 'round' }),
      ]
  }
}

function wallStyles(
  drawn: DrawnFeature,
  resolution: number,
  palette: Palette,
  faint: number,
  zIndex: number,
): Style[] {
  const vertices = verticesOf(drawn.geometry)
  const stroke = (width: number) =>
    new Stroke({ color: paint(palette.flint, faint), width, lineCap: 'butt', lineJoin: 'miter' })
  return [
    new Style({ stroke: stroke(3), zIndex }),
    new Style({
      geometry: new MultiLineString(hatchStrokes(vertices, 8 * resolution, 3.6 * resolution)),
      stroke: stroke(1.3),
      zIndex,
    }),
  ]
}

/** Draws a point symbol about (0, 0), in pixels, y downwards. */
type SymbolDrawing = (context: CanvasRenderingContext2D) => void

function path(context: CanvasRenderingContext2D, strokes: [number, number][][], closed = false) {
  context.beginPath()
  for (const stroke of strokes) {
    for (const [i, [x, y]] of stroke.entries()) {
      if (i === 0) context.moveTo(x, y)
      else context.lineTo(x, y)
    }
    if (closed) context.closePath()
  }
}

/** Abstraction: a circled cross. Recharge: the cross in a square on its point. */
function wellDrawing(kind: 'abstraction' | 'recharge', palette: Palette): SymbolDrawing {
  return (context) => {
    const recharge = kind === 'recharge'
    context.lineWidth = 1.7
    context.strokeStyle = paint(recharge ? palette.bourne : palette.flint)
    context.fillStyle = paint(recharge ? palette['bourne-2'] : palette.chalk)
    if (recharge) {
      const side: [number, number][] = [
        [0, -9],
        [9, 0],
        [0, 9],
        [-9, 0],
      ]
      path(context, [side], true)
    } else {
      context.beginPath()
      context.arc(0, 0, 6, 0, 2 * Math.PI)
    }
    context.fill()
    context.stroke()
    const reach = recharge ? 4.5 : 9
    path(context, [
      [
        [-reach, 0],
        [reach, 0],
      ],
      [
        [0, -reach],
        [0, reach],
      ],
    ])
    context.lineWidth = 1.4
    context.stroke()
  }
}

/** The mark of a water level: a triangle on its point over a short line. */
function instrumentDrawing(palette: Palette): SymbolDrawing {
  return (context) => {
    context.lineJoin = 'round'
    context.lineWidth = 1.7
    context.strokeStyle = paint(palette.flint)
    context.fillStyle = paint(palette.chalk)
    const triangle: [number, number][] = [
      [-7, -8],
      [7, -8],
      [0, 4],
    ]
    path(context, [triangle], true)
    context.fill()
    context.stroke()
    path(context, [
      [
        [-5, 7.5],
        [5, 7.5],
      ],
    ])
    context.lineWidth = 1.5
    context.stroke()
  }
}

function pointDrawing(palette: Palette): SymbolDrawing {
  return (context) => {
    const strokes: [number, number][][] = [
      [
        [-4, -4],
        [4, 4],
      ],
      [
        [4, -4],
        [-4, 4],
      ],
    ]
    path(context, strokes)
    context.lineWidth = 5
    context.strokeStyle = paint(palette.chalk, 0.9)
    context.stroke()
    context.lineWidth = 2
    context.strokeStyle = paint(palette.flint)
    context.stroke()
  }
}

function symbolDrawing(drawn: DrawnFeature, palette: Palette): SymbolDrawing {
  if (drawn.kind === 'well') return wellDrawing(drawn.detail?.wellKind ?? 'abstraction', palette)
  return drawn.kind === 'instrument' ? instrumentDrawing(palette) : pointDrawing(palette)
}

const pictures = new WeakMap<Palette, Map<string, HTMLCanvasElement>>()

/** A point symbol as one picture, so that labels keep off exactly what is drawn; each is painted once a palette. */
function symbolImage(drawn: DrawnFeature, look: Look): Icon {
  // Twice the pixels, for screens that have them.
  const fineness = 2
  const size = 2 * symbolReach
  const known = pictures.get(look.palette) ?? new Map<string, HTMLCanvasElement>()
  pictures.set(look.palette, known)
  const key = `${drawn.kind} ${drawn.detail?.wellKind}`
  let picture = known.get(key)
  if (!picture) {
    picture = document.createElement('canvas')
    picture.width = size * fineness
    picture.height = size * fineness
    const context = picture.getContext('2d')
    if (context) {
      context.scale(fineness, fineness)
      context.translate(size / 2, size / 2)
      symbolDrawing(drawn, look.palette)(context)
    }
    known.set(key, picture)
  }
  return new Icon({
    img: picture,
    scale: look.symbolScale / fineness,
    opacity: drawn.muted ? 0.5 : 1,
    declutterMode: 'obstacle',
  })
}

function hatch(colour: string): CanvasPattern | string {
  const size = 8
  const tile = document.createElement('canvas')
  tile.width = size
  tile.height = size
  const context = tile.getContext('2d')
  if (!context) return colour
  context.strokeStyle = colour
  context.lineWidth = 1
  context.beginPath()
  // Three strokes, so that the corners of neighbouring tiles join.
  for (const shift of [-size, 0, size]) {
    context.moveTo(shift - 1, size + 1)
    context.lineTo(shift + size + 1, -1)
  }
  context.stroke()
  return context.createPattern(tile, 'repeat') ?? colour
}

function labelStyle(drawn: DrawnFeature, resolution: number, look: Look, chosen: boolean): Style | null {
  const { palette, fontSize } = look
  const base = {
    text: drawn.label,
    font: `${chosen ? 700 : 600} ${fontSize}px "Source Sans 3", system-ui, sans-serif`,
    fill: new Fill({ color: paint(drawn.muted ? palette['flint-2'] : palette.flint) }),
    stroke: new Stroke({ color: paint(palette.chalk, 0.92), width: 3.6 }),
    declutterMode: 'declutter' as const,
  }
  const { geometry } = drawn
  // A chosen symbol always shows its label; that of a line or an area still gives way to symbols.
  const zIndex = (chosen ? (geometry.type === 'point' ? 300 : 220) : 200) + rank[drawn.kind]
  if (geometry.type === 'point') {
    const side = look.side(drawn.id)
    const { align, x, y } = labelOffset(side ?? 'right', symbolReach * look.symbolScale, fontSize)
    return new Style({
      text: new Text({
        ...base,
        textAlign: align,
        offsetX: x,
        offsetY: y,
        declutterMode: side || chosen ? 'obstacle' : 'declutter',
      }),
      zIndex,
    })
  }
  if (geometry.type === 'line') {
    const place = look.along(drawn.id)
    if (!place) return null
    return new Style({
      geometry: new Point([place.x * resolution, -place.y * resolution]),
      text: new Text({ ...base, rotation: place.angle, declutterMode: 'obstacle' }),
      zIndex,
    })
  }
  if (drawn.kind === 'extent') {
    return new Style({
      geometry: new Point(topEdge(geometry.vertices)),
      text: new Text({ ...base, offsetY: -(fontSize / 2 + 6) }),
      zIndex,
    })
  }
  return new Style({ text: new Text({ ...base, overflow: true }), zIndex })
}

/** Middle of the uppermost edge of an outline, on which an extent carries its name. */
function topEdge(vertices: readonly Vertex[]): Vertex {
  const edges = vertices.map((a, i): Vertex => {
    const b = vertices[(i + 1) % vertices.length] as Vertex
    return [(a[0] + b[0]) / 2, (a[1] + b[1]) / 2]
  })
  return edges.reduce((top, at) => (at[1] > top[1] ? at : top))
}

/** The line along which something is measured. */
export function measuredStyle(palette: Palette): Style[] {
  return [
    new Style({ stroke: new Stroke({ color: paint(palette.chalk), width: 4.5 }) }),
    new Style({ stroke: new Stroke({ color: paint(palette.madder), width: 1.8, lineDash: [8, 4] }) }),
    new Style({
      geometry: (feature) => {
        const geometry = feature.getGeometry()
        return geometry instanceof LineString ? new MultiPoint(geometry.getCoordinates()) : undefined
      },
      image: new Circle({ radius: 3, fill: new Fill({ color: paint(palette.madder) }) }),
    }),
  ]
}
