import { typeWidth } from './boxes'
import { niceAbove } from './contours'

/** Where things stand in a figure: the plot to one scale in both directions, and the strip of keys below it. */

export interface Extent {
  xEdges: Float64Array
  yEdges: Float64Array
}

export interface FigureSize {
  width: number
  /** Left out: as high as the plot needs at full width. */
  height?: number
  /** Multiplies type and symbols; 1 gives type 12 pixels high. */
  fontScale?: number
  /** The plot is never higher than this, pixels. */
  highestPlot?: number
}

export interface KeyItem {
  name: string
  label: string
}

export interface Layout {
  width: number
  height: number
  size: number
  plot: { left: number; top: number; width: number; height: number }
  /** Pixels for each unit of length. */
  scale: number
  legend: { left: number; top: number; width: number }
  scaleBar: { left: number; top: number; width: number }
  /** Left end of each key item's sample; its label starts `sampleWidth` further on. */
  keys: { item: KeyItem; x: number; y: number }[]
  sampleWidth: number
  caption: { text: string; x: number; y: number }[]
  toPixel(x: number, y: number): [number, number]
  toGround(pixelX: number, pixelY: number): [number, number]
}

/** Breaks text into lines that fit a width, at spaces. */
export function brokenText(text: string, width: number, size: number): string[] {
  const lines: string[] = []
  let line = ''
  for (const word of text.split(' ')) {
    const longer = line === '' ? word : `${line} ${word}`
    if (line !== '' && typeWidth(longer, size) > width) {
      lines.push(line)
      line = word
    } else line = longer
  }
  return line === '' ? lines : [...lines, line]
}

/** Lays a figure out. Throws when the height leaves no room for a plot. */
export function layoutOf(
  { xEdges, yEdges }: Extent,
  { width, height, fontScale = 1, highestPlot = Number.POSITIVE_INFINITY }: FigureSize,
  keyItems: readonly KeyItem[],
  captionText: string | undefined,
): Layout {
  const size = fontScale
  const west = xEdges[0] as number
  const east = xEdges.at(-1) as number
  const south = yEdges[0] as number
  const north = yEdges.at(-1) as number
  const left = 26 * size
  const right = 10 * size
  const top = 10 * size
  const inner = width - left - right
  const wide = width >= 600 * size

  // Everything below the plot, measured from its lower edge.
  const gap = 26 * size
  const legendHeight = 52 * size
  const scaleHeight = 40 * size
  let below = gap + (wide ? legendHeight : legendHeight + scaleHeight)
  const legendWidth = wide ? Math.min(430 * size, inner * 0.56) : inner
  const sampleWidth = 30 * size
  const keyPlaces: { item: KeyItem; x: number; y: number }[] = []
  let x = left
  let y = below + 10 * size
  for (const item of keyItems) {
    const needs = sampleWidth + typeWidth(item.label, 12 * size) + 16 * size
    if (x > left && x + needs > width - right + 16 * size) {
      x = left
      y += 21 * size
    }
    keyPlaces.push({ item, x, y })
    x += needs
  }
  if (keyPlaces.length > 0) below = y + 14 * size
  const caption = captionText ? brokenText(captionText, inner, 12.5 * size) : []
  const captionTop = below + 12 * size
  if (caption.length > 0) below = captionTop + caption.length * 17 * size - 2 * size
  below += 4 * size

  const room = Math.min(highestPlot, height === undefined ? Number.POSITIVE_INFINITY : height - top - below)
  if (!(room > 20 && inner > 20)) throw new Error('There is no room for the plot in a figure of this size.')
  const scale = Math.min(inner / (east - west), room / (north - south))
  const plot = {
    width: (east - west) * scale,
    height: (north - south) * scale,
    left: left + (inner - (east - west) * scale) / 2,
    top,
  }
  const bottom = height === undefined ? top + plot.height : Math.max(top + plot.height, height - below)
  plot.top = top + (bottom - top - plot.height) / 2
  const strip = plot.top + plot.height
  return {
    width,
    height: height ?? strip + below,
    size,
    plot,
    scale,
    legend: { left: width - right - legendWidth, top: strip + gap, width: legendWidth },
    scaleBar: {
      left,
      top: strip + gap + (wide ? 6 * size : legendHeight),
      width: wide ? inner - legendWidth - 24 * size : inner,
    },
    keys: keyPlaces.map((place) => ({ ...place, y: place.y + strip })),
    sampleWidth,
    caption: caption.map((text, k) => ({ text, x: left, y: strip + captionTop + k * 17 * size })),
    toPixel: (groundX, groundY) => [
      plot.left + (groundX - west) * scale,
      plot.top + (north - groundY) * scale,
    ],
    toGround: (pixelX, pixelY) => [west + (pixelX - plot.left) / scale, north - (pixelY - plot.top) / scale],
  }
}

/** A round length for the scale bar: the longest of 1, 2 and 5 times a power of ten that fits a width. */
export function scaleBarLength(scale: number, width: number): number {
  const most = width / scale
  const power = 10 ** Math.floor(Math.log10(most))
  const mantissa = [5, 2, 1].find((step) => step * power <= most) ?? 1
  return Number((mantissa * power).toPrecision(12))
}

/** Round coordinates along an axis, about one each `apart` pixels. */
export function ticksOf(
  from: number,
  to: number,
  scale: number,
  apart: number,
): { step: number; ticks: number[] } {
  const step = niceAbove(apart / scale)
  const ticks: number[] = []
  for (let k = Math.ceil(from / step - 1e-9); k * step <= to + 1e-9 * step; k++) ticks.push(k * step)
  return { step, ticks }
}
