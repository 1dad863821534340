/** Where a label stands about its symbol. */
const labelPlaces = [
  'right',
  'left',
  'above',
  'below',
  'above right',
  'below right',
  'above left',
  'below left',
] as const
export type LabelSide = (typeof labelPlaces)[number]

export interface LabelledSymbol {
  id: string
  /** Place on the screen in pixels, y downwards. */
  x: number
  y: number
  width: number
}

const gap = 4

/** Offset of a label's middle line from its symbol in pixels, y downwards, and how the text is aligned there. */
export function labelOffset(
  side: LabelSide,
  reach: number,
  fontSize: number,
): { align: 'left' | 'center' | 'right'; x: number; y: number } {
  const straight = side === 'above' || side === 'below'
  const beside = side === 'right' || side === 'left'
  const align = straight ? 'center' : side.includes('left') ? 'right' : 'left'
  const across = beside ? reach + gap : reach * 0.55
  const up = straight ? reach + gap + fontSize * 0.45 : reach * 0.55 + fontSize * 0.5
  return {
    align,
    x: straight ? 0 : align === 'left' ? across : -across,
    y: beside ? 0 : side.startsWith('above') ? -up : up,
  }
}

interface Box {
  left: number
  right: number
  top: number
  bottom: number
}

function labelBox({ x, y, width }: LabelledSymbol, side: LabelSide, reach: number, fontSize: number): Box {
  const offset = labelOffset(side, reach, fontSize)
  const left = x + offset.x - (offset.align === 'left' ? 0 : offset.align === 'right' ? width : width / 2)
  // A pixel or two for the halo.
  const [halo, half] = [1.5, fontSize * 0.55]
  return {
    left: left - halo,
    right: left + width + halo,
    top: y + offset.y - half,
    bottom: y + offset.y + half,
  }
}

function overlap(a: Box, b: Box): boolean {
  return a.left < b.right && b.left < a.right && a.top < b.bottom && b.top < a.bottom
}

export interface LabelledLine {
  id: string
  /** Vertices on the screen in pixels, y downwards. */
  vertices: readonly (readonly [number, number])[]
  width: number
}

/** Middle of a line's label on the screen, and its turn in radians clockwise. */
export interface LinePlace {
  x: number
  y: number
  angle: number
}

export interface PlacedLabels {
  /** Null where no side is free. */
  sides: Map<string, LabelSide | null>
  /** Null where the label has no room along its line. */
  lines: Map<string, LinePlace | null>
}

/**
 * Where labels stand so that they keep off symbols and off each other. A symbol's label takes the first free side in the
 * order of `labelPlaces`; a line's label runs along one of its stretches, above it or below. `reach` is half a symbol's
 * size.
 */
export function placeLabels(
  symbols: readonly LabelledSymbol[],
  lines: readonly LabelledLine[],
  reach: number,
  fontSize: number,
): PlacedLabels {
  const marks = symbols.map(({ x, y }) => ({
    left: x - reach,
    right: x + reach,
    top: y - reach,
    bottom: y + reach,
  }))
  const taken: Box[] = []
  const sides = new Map<string, LabelSide | null>()
  for (const [index, symbol] of symbols.entries()) {
    const free = labelPlaces.find((side) => {
      const box = labelBox(symbol, side, reach, fontSize)
      return (
        !taken.some((other) => overlap(box, other)) &&
        !marks.some((mark, i) => i !== index && overlap(box, mark))
      )
    })
    sides.set(symbol.id, free ?? null)
    if (free) taken.push(labelBox(symbol, free, reach, fontSize))
  }
  taken.push(...marks)
  const placed = new Map<string, LinePlace | null>()
  for (const line of lines) {
    const free = linePlaces(line, fontSize).find((place) =>
      beads(place, line.width, fontSize).every((bead) => !taken.some((other) => overlap(bead, other))),
    )
    placed.set(line.id, free ?? null)
    if (free) taken.push(...beads(free, line.width, fontSize))
  }
  return { sides, lines: placed }
}

/** Places along a line, the best first: long stretches near half way, above before below. */
function linePlaces({ vertices, width }: LabelledLine, fontSize: number): LinePlace[] {
  const stretches = vertices.slice(1).map((b, i) => {
    const a = vertices[i] as readonly [number, number]
    return {
      a,
      b,
      length: Math.hypot(b[0] - a[0], b[1] - a[1]),
      off: Math.abs(i - (vertices.length - 2) / 2),
    }
  })
  const longest = Math.max(0, ...stretches.map(({ length }) => length))
  const long = (length: number) => length >= Math.min(width, 0.75 * longest)
  return stretches
    .sort((one, other) => Number(long(other.length)) - Number(long(one.length)) || one.off - other.off)
    .slice(0, 12)
    .flatMap(({ a, b }) => {
      let angle = Math.atan2(b[1] - a[1], b[0] - a[0])
      // Never upside down; what stands upright reads from below.
      if (angle >= Math.PI / 2 - 1e-9) angle -= Math.PI
      if (angle < -Math.PI / 2 - 1e-9) angle += Math.PI
      const away = fontSize / 2 + 6
      return [1, -1].map((side) => ({
        x: (a[0] + b[0]) / 2 + side * away * Math.sin(angle),
        y: (a[1] + b[1]) / 2 - side * away * Math.cos(angle),
        angle,
      }))
    })
}

/** A turned label as a string of upright squares. */
function beads({ x, y, angle }: LinePlace, width: number, fontSize: number): Box[] {
  const half = fontSize * 0.55
  const count = Math.max(1, Math.ceil(width / fontSize))
  return Array.from({ length: count }, (_, i) => {
    const along = ((i + 0.5) / count - 0.5) * width
    const [cx, cy] = [x + along * Math.cos(angle), y + along * Math.sin(angle)]
    return { left: cx - half, right: cx + half, top: cy - half, bottom: cy + half }
  })
}

/**
 * Scale of the symbols: 1, or down to 0.7 where many stand so near to each other that they would touch. `spread` is the
 * distance in pixels below which symbols of full size crowd.
 */
export function symbolScale(symbols: readonly LabelledSymbol[], spread: number): number {
  if (symbols.length < 4) return 1
  const nearest = symbols
    .map((symbol, i) =>
      symbols.reduce(
        (least, other, j) =>
          i === j ? least : Math.min(least, Math.hypot(symbol.x - other.x, symbol.y - other.y)),
        Number.POSITIVE_INFINITY,
      ),
    )
    .sort((a, b) => a - b)
  const quarter = nearest[Math.floor(nearest.length / 4)] ?? spread
  return Math.max(0.7, Math.min(1, quarter / spread))
}
