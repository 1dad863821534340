import { z } from 'zod'
import { coordinate, polygon, positive, quantity, source, text, within } from '~/book/field'
import { convert } from '~/units'

const optionalStorage = positive('per length', 'Specific storage').nullable().default(null)
const optionalFraction = (what: string) =>
  z.number().gt(0, `${what} must be above 0.`).lt(1, `${what} must be below 1.`).nullable().default(null)

/** A kind of ground, with the hydraulic conductivity (permeability k) along x and y in plan. */
export const materialSchema = z
  .strictObject({
    name: text(80, 'Name the material.'),
    kx: positive('conductivity', 'Hydraulic conductivity'),
    ky: positive('conductivity', 'Hydraulic conductivity'),
    kLow: positive('conductivity', 'The low end of the range').nullable().default(null),
    kHigh: positive('conductivity', 'The high end of the range').nullable().default(null),
    specificStorage: optionalStorage,
    specificYield: optionalFraction('Specific yield'),
    porosity: optionalFraction('Porosity'),
    source,
  })
  .refine((m) => within(m.kx, m.kLow, m.kHigh), {
    path: ['kx'],
    error: 'Hydraulic conductivity lies outside its own stated range.',
  })
export type Material = z.infer<typeof materialSchema>

/** Where a material lies: everywhere (no polygon) or in a polygon; a later zone replaces earlier ones. */
export const zoneSchema = z
  .strictObject({
    name: text(80, 'Name the zone.'),
    materialId: z.string({ error: 'Choose the material.' }).min(1, 'Choose the material.'),
    polygon: polygon.nullable().default(null),
    base: quantity('length'),
    top: quantity('length').nullable().default(null),
    source,
  })
  .refine((zone) => !zone.top || convert(zone.top, zone.base.unit) > zone.base.value, {
    path: ['top'],
    error: 'The top level must lie above the base level.',
  })
export type Zone = z.infer<typeof zoneSchema>

/** A named point where heads are wanted; an instrument may refer to one. */
export const pointSchema = z.strictObject({
  name: text(40, 'Name the point.'),
  x: coordinate,
  y: coordinate,
  source,
})
export type Point = z.infer<typeof pointSchema>

/** The plan image under the drawing: a stored picture, placed by two points known in both. */
export const planImageSchema = z
  .strictObject({
    fileId: z.number().int().positive(),
    width: z.number().int().positive(),
    height: z.number().int().positive(),
    /** Pixel from the top left corner, and the coordinates of the same spot. */
    control: z.tuple([
      z.strictObject({ column: z.number(), row: z.number(), x: coordinate, y: coordinate }),
      z.strictObject({ column: z.number(), row: z.number(), x: coordinate, y: coordinate }),
    ]),
    opacity: z.number().min(0).max(1).default(0.6),
  })
  .refine(({ control: [a, b] }) => Math.hypot(a.column - b.column, a.row - b.row) >= 10, {
    path: ['control'],
    error: 'The two known points must lie at least 10 pixels apart.',
  })
  .refine(({ control: [a, b] }) => Math.hypot(a.x - b.x, a.y - b.y) > 0, {
    path: ['control'],
    error: 'The two known points have the same coordinates.',
  })
export type PlanImage = z.infer<typeof planImageSchema>
