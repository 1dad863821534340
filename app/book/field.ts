import { z } from 'zod'
import { convert, type Dimension, isUnitName, type Quantity, unitLabel, units, unitsOf } from '~/units'
import { list } from './list'

/** Building blocks of row schemas, with messages that a sheet can show beside the cell. */

export function text(max: number, needed?: string) {
  const base = z
    .string({ error: needed ?? 'Text is needed.' })
    .trim()
    .max(max, `At most ${max} characters.`)
  return needed ? base.min(1, needed) : base
}

/** Where a row came from, shown in the reference margin. */
export const source = text(500).default('')

export function quantity(dimension: Dimension) {
  return z
    .strictObject(
      {
        value: z
          .number({ error: 'A number is needed.' })
          .refine(Number.isFinite, 'A finite number is needed.'),
        unit: z.string().refine(isUnitName, 'This is not a unit that Lavant knows.'),
      },
      { error: 'A number with its unit is needed.' },
    )
    .refine((q) => units[q.unit as Quantity['unit']]?.dimension === dimension, {
      error: `The unit must be one of ${unitsOf(dimension).map(unitLabel).join(', ')}.`,
    })
    .transform((q) => q as Quantity)
}

/** A quantity above zero. */
export function positive(dimension: Dimension, what: string) {
  return quantity(dimension).refine((q) => q.value > 0, `${what} must be above zero.`)
}

/** A quantity of zero or more: direction is chosen by a kind, never by a sign. */
export function notNegative(dimension: Dimension, what: string) {
  return quantity(dimension).refine((q) => q.value >= 0, `${what} carries no sign: choose the kind instead.`)
}

/** A coordinate of the project's grid reference system, in metres or feet as that system has it. */
export const coordinate = z
  .number({ error: 'A coordinate is needed.' })
  .refine(Number.isFinite, 'A finite number is needed.')

export const vertex = z.tuple([coordinate, coordinate])
export type Vertex = [number, number]

export const polyline = list(vertex, {
  least: 2,
  most: 2000,
  tooFew: 'A line needs two vertices at least.',
})
export const polygon = list(vertex, {
  least: 3,
  most: 2000,
  tooFew: 'A polygon needs three vertices at least.',
})
  .refine((ring) => Math.abs(signedArea(ring as Vertex[])) > 0, 'This polygon has no area.')
  .refine((ring) => !crossesItself(ring as Vertex[]), 'The edges of this polygon cross each other.')

/** Area of a polygon by the shoelace formula, positive anticlockwise, in the square of the coordinates' unit. */
export function signedArea(ring: readonly Vertex[]): number {
  let sum = 0
  for (let i = 0; i < ring.length; i++) {
    const [x1, y1] = ring[i] as Vertex
    const [x2, y2] = ring[(i + 1) % ring.length] as Vertex
    sum += x1 * y2 - x2 * y1
  }
  return sum / 2
}

/** Length of a line, in the coordinates' unit. */
export function lineLength(line: readonly Vertex[]): number {
  let sum = 0
  for (let i = 1; i < line.length; i++) {
    const [x1, y1] = line[i - 1] as Vertex
    const [x2, y2] = line[i] as Vertex
    sum += Math.hypot(x2 - x1, y2 - y1)
  }
  return sum
}

function turn(a: Vertex, b: Vertex, c: Vertex): number {
  return Math.sign((b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0]))
}

function crossesItself(ring: readonly Vertex[]): boolean {
  const n = ring.length
  for (let i = 0; i < n; i++) {
    const a = ring[i] as Vertex
    const b = ring[(i + 1) % n] as Vertex
    for (let j = i + 2; j < n; j++) {
      if (i === 0 && j === n - 1) continue
      const c = ring[j] as Vertex
      const d = ring[(j + 1) % n] as Vertex
      if (turn(a, b, c) * turn(a, b, d) < 0 && turn(c, d, a) * turn(c, d, b) < 0) return true
    }
  }
  return false
}

/** Recognises a value outside a stated range: used for lower and upper ends of a material's conductivity. */
export function within(value: Quantity, low: Quantity | null, high: Quantity | null): boolean {
  const at = convert(value, value.unit)
  return (!low || convert(low, value.unit) <= at) && (!high || convert(high, value.unit) >= at)
}

/** Where a row lies, whatever else it may still lack: enough to draw it. */
export const placeSchemas = {
  point: z.looseObject({ x: coordinate, y: coordinate }),
  line: z.looseObject({ line: polyline }),
  polygon: z.looseObject({ polygon }),
}
