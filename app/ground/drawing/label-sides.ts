/** Where a label stands about its symbol. */
export const labelPlaces = [
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

/**
 * The side on which each symbol carries its label, so that labels keep off other symbols and off labels already placed:
 * the first free one in the order of `labelPlaces`, null where none is free. `reach` is half a symbol's size.
 */
export function labelSides(
  symbols: readonly LabelledSymbol[],
  reach: number,
  fontSize: number,
): Map<string, LabelSide | null> {
  const marks = symbols.map(({ x, y }) => ({
    left: x - reach,
    right: x + reach,
    top: y - reach,
    bottom: y + reach,
  }))
  const placed: Box[] = []
  const sides = new Map<string, LabelSide | null>()
  for (const [index, symbol] of symbols.entries()) {
    const free = labelPlaces.find((side) => {
      const box = labelBox(symbol, side, reach, fontSize)
      return (
        !placed.some((other) => overlap(box, other)) &&
        !marks.some((mark, i) => i !== index && overlap(box, mark))
      )
    })
    sides.set(symbol.id, free ?? null)
    if (free) placed.push(labelBox(symbol, free, reach, fontSize))
  }
  return sides
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
