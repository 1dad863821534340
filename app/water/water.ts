import { z } from 'zod'
import { coordinate, notNegative, polygon, polyline, positive, quantity, source, text } from '~/book/field'
import { list } from '~/book/list'
import { convert } from '~/units'

export const wellKinds = ['abstraction', 'recharge'] as const

/** A well. Its kind gives the direction; the rate carries no sign. */
export const wellSchema = z
  .strictObject({
    name: text(40, 'Name the well.'),
    x: coordinate,
    y: coordinate,
    kind: z.enum(wellKinds, { error: 'Choose abstraction or recharge.' }),
    rate: notNegative('rate', 'A rate'),
    radius: positive('length', 'The radius').nullable().default(null),
    lowestLevel: quantity('length').nullable().default(null),
    /** Levels between which the well is open; blank = over the whole saturated thickness. */
    screenTop: quantity('length').nullable().default(null),
    screenBottom: quantity('length').nullable().default(null),
    source,
  })
  .superRefine(({ screenTop, screenBottom }, context) => {
    const say = (path: string, message: string) => context.addIssue({ code: 'custom', path: [path], message })
    if (screenTop && !screenBottom) say('screenBottom', 'A screen needs its bottom as well as its top.')
    else if (screenBottom && !screenTop) say('screenTop', 'A screen needs its top as well as its bottom.')
    else if (screenTop && screenBottom && convert(screenBottom, screenTop.unit) >= screenTop.value)
      say('screenBottom', 'The bottom of the screen must lie below its top.')
  })
export type Well = z.infer<typeof wellSchema>

/** Recharge over a polygon, or everywhere; zones add up where they overlap. */
export const rechargeZoneSchema = z.strictObject({
  name: text(80, 'Name the recharge zone.'),
  polygon: polygon.nullable().default(null),
  rate: notNegative('conductivity', 'Recharge'),
  source,
})
export type RechargeZone = z.infer<typeof rechargeZoneSchema>

export const boundaryKinds = ['fixed head', 'specified flux', 'head-dependent flux', 'drain'] as const
export const fluxDirections = ['into the model', 'out of the model'] as const

/**
 * A boundary along a line. `levels` holds one head (or drain level) a vertex, or a single one for the whole line.
 * Conductance is per unit of line (length/time); a specified flux has its direction chosen and no sign.
 */
export const boundarySchema = z
  .strictObject({
    name: text(80, 'Name the boundary.'),
    kind: z.enum(boundaryKinds, { error: 'Choose the kind of boundary.' }),
    line: polyline,
    levels: list(quantity('length'), { most: 2000 }).nullable().default(null),
    flux: notNegative('line flux', 'A flux').nullable().default(null),
    direction: z.enum(fluxDirections).default('into the model'),
    conductance: positive('conductivity', 'Conductance').nullable().default(null),
    disconnectsBelow: quantity('length').nullable().default(null),
    /** Stands for distance, not for a real feature: the run's own verification may swap it. */
    outer: z.boolean().default(false),
    source,
  })
  .superRefine((boundary, context) => {
    const say = (path: string, message: string) => context.addIssue({ code: 'custom', path: [path], message })
    if (boundary.kind === 'specified flux') {
      if (!boundary.flux) say('flux', 'A specified flux needs its flux for each unit of line.')
    } else if (!boundary.levels || boundary.levels.length === 0) {
      say('levels', boundary.kind === 'drain' ? 'A drain needs its level.' : 'This boundary needs its head.')
    } else if (boundary.levels.length !== 1 && boundary.levels.length !== boundary.line.length) {
      say('levels', `Give one level, or one a vertex: the line has ${boundary.line.length} vertices.`)
    }
    if ((boundary.kind === 'head-dependent flux' || boundary.kind === 'drain') && !boundary.conductance) {
      say('conductance', 'This boundary needs its conductance for each unit of line.')
    }
  })
export type Boundary = z.infer<typeof boundarySchema>

/** A cut-off wall; conductivity 0 is impermeable. In plan it acts over the whole saturated thickness. */
export const wallSchema = z.strictObject({
  name: text(80, 'Name the wall.'),
  line: polyline,
  thickness: positive('length', 'The thickness'),
  k: notNegative('conductivity', 'Hydraulic conductivity'),
  /** Level of its lower end; blank = at the base of the ground or below. */
  toe: quantity('length').nullable().default(null),
  source,
})
export type Wall = z.infer<typeof wallSchema>
