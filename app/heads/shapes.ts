import type { Vertex } from '~/book/field'
import type { Box } from './boxes'
import { pathOf } from './lines'

/** Elements of an ECharts custom series: paths, type and groups are all that a figure needs, on a page and in a PDF. */
export type Shape = PathShape | TypeShape | GroupShape

interface Style {
  fill?: string
  fillOpacity?: number
  stroke?: string
  strokeOpacity?: number
  lineWidth?: number
  lineDash?: number[]
  lineCap?: 'butt' | 'round' | 'square'
  lineJoin?: 'miter' | 'round' | 'bevel'
}

interface PathShape {
  type: 'path'
  shape: { pathData: string }
  style: Style
  silent: true
}

interface TypeShape {
  type: 'text'
  x: number
  y: number
  rotation?: number
  style: {
    text: string
    fill: string
    opacity?: number
    fontFamily: string
    fontSize: number
    fontWeight: 400 | 600
    align: 'left' | 'center' | 'right'
    verticalAlign: 'top' | 'middle' | 'bottom'
  }
  silent: true
}

interface GroupShape {
  type: 'group'
  children: Shape[]
  /** When a figure is drawn anew its shapes are new: matched to old ones by number they would keep parts of their styles. */
  $mergeChildren: false
  silent: true
}

export function group(children: Shape[]): GroupShape {
  return { type: 'group', children, $mergeChildren: false, silent: true }
}

/** A filled shape. */
export function filled(pathData: string, fill: string, fillOpacity = 1): PathShape {
  return { type: 'path', shape: { pathData }, style: { fill, fillOpacity }, silent: true }
}

/** A drawn line; joins and ends are round unless said otherwise. */
export function drawn(pathData: string, stroke: string, lineWidth: number, more: Style = {}): PathShape {
  return {
    type: 'path',
    shape: { pathData },
    style: { fill: 'none', stroke, lineWidth, lineCap: 'round', lineJoin: 'round', ...more },
    silent: true,
  }
}

/** A line with a casing, so that it shows on light and dark fills alike. */
export function cased(
  pathData: string,
  stroke: string,
  lineWidth: number,
  casing: string,
  more: Style = {},
): PathShape[] {
  return [
    drawn(pathData, casing, lineWidth + 2.4, { strokeOpacity: 0.85 }),
    drawn(pathData, stroke, lineWidth, more),
  ]
}

/** Quoted, since a name that ends in a bare digit is no CSS identifier. */
export const typeFace = "'Source Sans 3'"

/** One line of type. `angle` is clockwise as seen, radians. */
export function type(
  x: number,
  y: number,
  text: string,
  style: {
    fill: string
    size: number
    weight?: 400 | 600
    align?: 'left' | 'center' | 'right'
    vertical?: 'top' | 'middle' | 'bottom'
    angle?: number
    opacity?: number
  },
): TypeShape {
  return {
    type: 'text',
    x,
    y,
    ...(style.angle ? { rotation: -style.angle } : {}),
    style: {
      text,
      fill: style.fill,
      ...(style.opacity === undefined ? {} : { opacity: style.opacity }),
      fontFamily: typeFace,
      fontSize: style.size,
      fontWeight: style.weight ?? 400,
      align: style.align ?? 'left',
      verticalAlign: style.vertical ?? 'middle',
    },
    silent: true,
  }
}

/** Outline of a box, for filling. */
export function pathOfBox(box: Box): string {
  const cos = Math.cos(box.angle)
  const sin = Math.sin(box.angle)
  const corner = (across: number, down: number): Vertex => [
    box.x + across * box.width * cos - down * box.height * sin,
    box.y + across * box.width * sin + down * box.height * cos,
  ]
  return pathOf([corner(-0.5, -0.5), corner(0.5, -0.5), corner(0.5, 0.5), corner(-0.5, 0.5)], true)
}

export function pathOfRectangle(left: number, top: number, width: number, height: number): string {
  return pathOf(
    [
      [left, top],
      [left + width, top],
      [left + width, top + height],
      [left, top + height],
    ],
    true,
  )
}

/** A circle as path data: two half arcs. */
export function pathOfCircle(x: number, y: number, radius: number): string {
  return `M${x - radius} ${y}A${radius} ${radius} 0 1 1 ${x + radius} ${y}A${radius} ${radius} 0 1 1 ${x - radius} ${y}Z`
}
