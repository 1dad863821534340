import { z } from 'zod'
import { coordinate, positive, quantity, text } from '~/book/field'
import { list } from '~/book/list'
import type { Row } from '~/book/row'
import { type Dimension, type Quantity, units } from '~/units'

/**
 * Quantities of other sections' rows that a case may set for itself: the rate of a well, the recharge of a zone, the
 * hydraulic conductivity k of a wall or a material (ky keeps its ratio to kx), the level of a boundary along its
 * whole line, the flux of a boundary.
 */
const overridable = ['rate', 'recharge', 'k', 'level', 'flux'] as const
export type Overridable = (typeof overridable)[number]

export const overrideDimension: Record<Overridable, Dimension> = {
  rate: 'rate',
  recharge: 'conductivity',
  k: 'conductivity',
  level: 'length',
  flux: 'line flux',
}

const anyQuantity = z.union([
  quantity('rate'),
  quantity('conductivity'),
  quantity('length'),
  quantity('line flux'),
])

const overrideSchema = z
  .strictObject({ rowId: z.string().min(1), quantity: z.enum(overridable), value: anyQuantity })
  .refine((o) => units[o.value.unit].dimension === overrideDimension[o.quantity], {
    path: ['value'],
    error: 'The unit does not belong to this quantity.',
  })
  .refine((o) => o.quantity === 'level' || o.value.value >= 0, {
    path: ['value'],
    error: 'This quantity carries no sign: its direction is chosen in section 3.',
  })
export type Override = z.infer<typeof overrideSchema>

/** Relative to the right-hand side of the equations; what a run is held to when the case sheet says nothing. */
export const defaultTolerance = 1e-10

/** How the equations may be solved, as the model file has it, in the words of the case sheet. */
export const methodWords = {
  automatic: 'automatic',
  sor: 'successive over-relaxation',
  multigrid: 'multigrid',
} as const
export type CaseMethod = keyof typeof methodWords
const methods = Object.keys(methodWords) as CaseMethod[]

/** Multigrid, and relaxation where that does not get there. */
export const defaultMethod: CaseMethod = 'automatic'

/** A number without a band is half a result; a case that is only tried may leave its verification out. */
export const defaultVerify = true

/** More cells than this are refused: a run would hold a server thread for too long. */
export const mostCells = 1_000_000

/**
 * A calculation case. The base case holds all settings; another case holds only what differs: blank inherits.
 * An override names a row, a quantity of that row and its value in this case.
 */
export const caseSchema = z
  .strictObject({
    name: text(80, 'Name the case.'),
    isBase: z.boolean().default(false),
    note: text(1000).default(''),
    flow: z.enum(['confined', 'unconfined']).nullable().default(null),
    extent: z
      .strictObject({ xMin: coordinate, xMax: coordinate, yMin: coordinate, yMax: coordinate })
      .refine((e) => e.xMax > e.xMin && e.yMax > e.yMin, 'The extent must have a width and a height.')
      .nullable()
      .default(null),
    cellSize: positive('length', 'The cell size').nullable().default(null),
    tolerance: z
      .number()
      .gt(0, 'A tolerance must be above 0.')
      .max(1e-4, 'A tolerance above 1e-4 is too loose for heads.')
      .nullable()
      .default(null),
    method: z.enum(methods).nullable().default(null),
    /** Whether the run tests its own grid, steps in time and outer boundary. */
    verify: z.boolean().nullable().default(null),
    overrides: list(overrideSchema, { most: 2000 })
      .default([])
      .refine(
        (all) => new Set(all.map((o) => `${o.rowId} ${o.quantity}`)).size === all.length,
        'A case can set a quantity once only.',
      ),
  })
  .superRefine((c, context) => {
    if (!c.isBase) return
    for (const field of ['flow', 'extent', 'cellSize'] as const) {
      if (c[field] === null)
        context.addIssue({ code: 'custom', path: [field], message: 'The base case needs this.' })
    }
  })
export type Case = z.infer<typeof caseSchema>
export type Extent = NonNullable<Case['extent']>

/** What a case comes to once blanks have taken the value of the base case. */
export interface CaseSettings {
  flow: 'confined' | 'unconfined' | null
  extent: Extent | null
  cellSize: Quantity | null
  tolerance: number
  method: CaseMethod
  verify: boolean
  overrides: Override[]
}

export function baseCase(cases: readonly Row<Case>[]): Row<Case> | undefined {
  return cases.find((row) => row.body.isBase)
}

/** The settings in force for a case: its own, else the base case's. */
export function settingsOf(base: Case | undefined, own: Case): CaseSettings {
  const inherited = own.isBase ? undefined : base
  const set = new Set(own.overrides.map((o) => `${o.rowId} ${o.quantity}`))
  return {
    flow: own.flow ?? inherited?.flow ?? null,
    extent: own.extent ?? inherited?.extent ?? null,
    cellSize: own.cellSize ?? inherited?.cellSize ?? null,
    tolerance: own.tolerance ?? inherited?.tolerance ?? defaultTolerance,
    method: own.method ?? inherited?.method ?? defaultMethod,
    verify: own.verify ?? inherited?.verify ?? defaultVerify,
    overrides: [
      ...own.overrides,
      ...(inherited?.overrides ?? []).filter((o) => !set.has(`${o.rowId} ${o.quantity}`)),
    ],
  }
}

/** The value that a case sets for a quantity of a row, or undefined where the row's own value holds. */
export function overrideOf(
  overrides: readonly Override[],
  rowId: string,
  quantity: Overridable,
): Quantity | undefined {
  return overrides.find((o) => o.rowId === rowId && o.quantity === quantity)?.value
}
