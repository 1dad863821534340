/**
 * Colours of figures, computed in OKLCH so that equal steps of head look like equal steps of lightness.
 * Conversion to sRGB: B. Ottosson, "A perceptual color space for image processing", 2020 (matrices as published
 * there), and the sRGB transfer curve of IEC 61966-2-1.
 */
export interface Oklch {
  /** Lightness, 0 to 1. */
  l: number
  /** Chroma, 0 for grey. */
  c: number
  /** Hue in degrees. */
  h: number
}

/** The sRGB colour as six hexadecimal digits ("#2a5f80"); a channel outside sRGB is clipped. */
export function toHex({ l, c, h }: Oklch): string {
  const angle = (h * Math.PI) / 180
  const a = c * Math.cos(angle)
  const b = c * Math.sin(angle)
  const long = (l + 0.3963377774 * a + 0.2158037573 * b) ** 3
  const medium = (l - 0.1055613458 * a - 0.0638541728 * b) ** 3
  const short = (l - 0.0894841775 * a - 1.291485548 * b) ** 3
  const linear = [
    4.0767416621 * long - 3.3077115913 * medium + 0.2309699292 * short,
    -1.2684380046 * long + 2.6097574011 * medium - 0.3413193965 * short,
    -0.0041960863 * long - 0.7034186147 * medium + 1.707614701 * short,
  ]
  const digits = linear.map((value) => {
    const curved = value <= 0.0031308 ? 12.92 * value : 1.055 * value ** (1 / 2.4) - 0.055
    return Math.round(255 * Math.min(1, Math.max(0, curved)))
      .toString(16)
      .padStart(2, '0')
  })
  return `#${digits.join('')}`
}

const headStops: readonly Oklch[] = [
  { l: 0.4, c: 0.06, h: 240 },
  { l: 0.55, c: 0.075, h: 215 },
  { l: 0.72, c: 0.07, h: 190 },
  { l: 0.86, c: 0.06, h: 140 },
  { l: 0.955, c: 0.05, h: 100 },
]
const drawdownStops: readonly Oklch[] = [
  { l: 0.975, c: 0.01, h: 60 },
  { l: 0.88, c: 0.055, h: 45 },
  { l: 0.73, c: 0.105, h: 35 },
  { l: 0.58, c: 0.14, h: 30 },
  { l: 0.43, c: 0.13, h: 27 },
]
const riseStops: readonly Oklch[] = [
  { l: 0.975, c: 0.01, h: 205 },
  { l: 0.84, c: 0.05, h: 205 },
  { l: 0.66, c: 0.08, h: 207 },
  { l: 0.47, c: 0.085, h: 210 },
]
const aboveStops: readonly Oklch[] = [
  { l: 0.975, c: 0.01, h: 75 },
  { l: 0.83, c: 0.09, h: 75 },
  { l: 0.66, c: 0.125, h: 68 },
  { l: 0.5, c: 0.115, h: 60 },
]

/** A place from 0 to 1 along a list of stops; beyond the ends, the end. */
function along(stops: readonly Oklch[], place: number): Oklch {
  const at = Math.min(1, Math.max(0, place)) * (stops.length - 1)
  const i = Math.min(stops.length - 2, Math.floor(at))
  const from = stops[i] as Oklch
  const to = stops[i + 1] as Oklch
  const t = at - i
  return { l: from.l + (to.l - from.l) * t, c: from.c + (to.c - from.c) * t, h: from.h + (to.h - from.h) * t }
}

/** Head, from the lowest (0, dark flint) to the highest (1, pale straw). */
export function headColour(place: number): Oklch {
  return along(headStops, place)
}

/** Drawdown: chalk at 0 to madder at 1; a rise (below 0) runs from chalk to bourne at -1. */
export function drawdownColour(place: number): Oklch {
  return place >= 0 ? along(drawdownStops, place) : along(riseStops, -place)
}

/** Residual = measured - modelled: ochre above 0, chalk at 0, bourne below, ends at 1 and -1. */
export function residualColour(place: number): Oklch {
  return place >= 0 ? along(aboveStops, place) : along(riseStops, -place)
}

/** A line that stays visible on a fill: lighter than dark fills, darker than light ones. */
export function lineOn(fill: Oklch): Oklch {
  return fill.l < 0.6
    ? { l: Math.min(0.93, fill.l + 0.3), c: fill.c * 0.6, h: fill.h }
    : { l: fill.l - 0.34, c: Math.min(0.07, fill.c), h: fill.h }
}

/** Type that reads on a fill, at 4.5 to 1 or better: white on dark fills, near black on middling, flint on light ones. */
export function typeOn(fill: Oklch): Oklch {
  if (fill.l < 0.565) return { l: 1, c: 0, h: 0 }
  return fill.l < 0.72 ? { l: 0.08, c: 0.01, h: 240 } : { l: 0.24, c: 0.015, h: 240 }
}
