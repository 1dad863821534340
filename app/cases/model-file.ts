import { z } from 'zod'
import { list, mostNamed } from '~/book/list'
import type { Model } from '~/solver/model'

const position = z.tuple([z.number(), z.number()])
const line = list(position, { least: 2 })
const polygon = list(position, { least: 3 })
const name = z.string()
const source = z.string().optional()
const stageValue = z.union([z.number(), list(z.number())])
const value = z.union([z.number(), list(z.number()), z.strictObject({ stages: list(stageValue) })])
const surface = z.union([
  z.number(),
  z.strictObject({ xyz: list(z.tuple([z.number(), z.number(), z.number()]), { least: 1 }) }),
])

const grid = z.union([
  z.strictObject({ columns: z.int().min(1), rows: z.int().min(1) }),
  z.strictObject({ xEdges: list(z.number(), { least: 2 }), yEdges: list(z.number(), { least: 2 }) }),
  z.strictObject({
    cellSize: z.number().positive(),
    refine: list(
      z.strictObject({ x: z.number(), y: z.number(), cellSize: z.number().positive() }),
    ).optional(),
  }),
])

const time = z.discriminatedUnion('kind', [
  z.strictObject({ kind: z.literal('steady') }),
  z.strictObject({
    kind: z.literal('transient'),
    initialHead: z.union([
      z.number(),
      list(z.number().nullable()),
      z.literal('steady'),
      z.literal('steady with wells'),
    ]),
    report: z.enum(['stages', 'steps']).optional(),
    stages: list(
      z.strictObject({
        name: z.string().optional(),
        duration: z.number().positive(),
        firstStep: z.number().positive().optional(),
        growth: z.number().min(1).optional(),
        largestStep: z.number().positive().optional(),
        steps: z.literal('automatic').optional(),
      }),
      { least: 1 },
    ),
  }),
])

const material = z.strictObject({
  name: z.string().min(1),
  kx: z.number().positive(),
  ky: z.number().positive(),
  angle: z.number().optional(),
  specificStorage: z.number().nonnegative().optional(),
  specificYield: z.number().nonnegative().optional(),
  porosity: z.number().positive().optional(),
  source,
})

const layer = z.strictObject({
  material: z.string(),
  base: surface.optional(),
  top: surface.optional(),
  source,
})

const ground = z.strictObject({
  polygon: polygon.optional(),
  material: z.string().optional(),
  base: surface.optional(),
  top: surface.optional(),
  layers: list(layer, { least: 1 }).optional(),
  source,
})

const well = z.strictObject({
  name,
  x: z.number(),
  y: z.number(),
  kind: z.enum(['abstraction', 'recharge']),
  rate: value,
  radius: z.number().positive().optional(),
  lowestLevel: z.number().optional(),
  screen: z.strictObject({ top: z.number(), bottom: z.number() }).optional(),
  source,
})

const recharge = z.strictObject({ name, polygon: polygon.optional(), rate: value, source })

const boundaryPlace = {
  name,
  line: line.optional(),
  polygon: polygon.optional(),
  outer: z.boolean().optional(),
  source,
}

const boundary = z.discriminatedUnion('kind', [
  z.strictObject({ ...boundaryPlace, kind: z.literal('fixed head'), head: value }),
  z.strictObject({ ...boundaryPlace, kind: z.literal('specified flux'), flux: value }),
  z.strictObject({
    ...boundaryPlace,
    kind: z.literal('head-dependent flux'),
    head: value,
    conductance: value,
    disconnectsBelow: value.optional(),
  }),
  z.strictObject({ ...boundaryPlace, kind: z.literal('drain'), level: value, conductance: value }),
  z.strictObject({ ...boundaryPlace, kind: z.literal('seepage face') }),
])

/** The model file, version 1: strict, so that a misspelt field is an error and not a silent default. */
const modelFile = z.strictObject({
  format: z.literal('lavant-model'),
  version: z.literal(1),
  title: z.string().optional(),
  place: z
    .strictObject({
      crs: z.string().optional(),
      origin: position.optional(),
      verticalDatum: z.string().optional(),
    })
    .optional(),
  start: z.iso.datetime({ offset: true }).optional(),
  units: z.strictObject({ length: z.enum(['m', 'ft']), time: z.enum(['s', 'd']) }),
  kind: z.enum(['plan', 'section']),
  flow: z.enum(['confined', 'unconfined', 'saturated', 'free surface']),
  extent: z.strictObject({ x: position, y: position }),
  grid,
  time,
  materials: list(material, { least: 1 }),
  ground: list(ground, { least: 1 }),
  wells: list(well).optional(),
  recharge: list(recharge).optional(),
  boundaries: list(boundary).optional(),
  walls: list(
    z.strictObject({
      name,
      line,
      thickness: z.number().positive(),
      k: z.number().nonnegative(),
      toe: z.number().optional(),
      source,
    }),
  ).optional(),
  leakage: list(
    z.strictObject({
      name,
      polygon: polygon.optional(),
      head: value,
      leakance: z.number().nonnegative(),
      source,
    }),
  ).optional(),
  points: list(
    z.strictObject({
      name,
      x: z.number(),
      y: z.number(),
      side: z.enum(['left', 'right']).optional(),
      source,
    }),
  ).optional(),
  lines: list(z.strictObject({ name, line, source })).optional(),
  rings: list(z.strictObject({ name, polygon, source })).optional(),
  solver: z
    .strictObject({
      method: z.enum(['automatic', 'sor', 'multigrid']).optional(),
      tolerance: z.number().positive().optional(),
    })
    .optional(),
  want: z
    .strictObject({
      verify: z.boolean().optional(),
      sensitivities: list(z.string()).optional(),
      responses: z.boolean().optional(),
      flowLines: list(
        z.union([
          z.strictObject({ from: position, direction: z.enum(['forward', 'back']) }),
          z.strictObject({
            well: z.string(),
            direction: z.enum(['forward', 'back']),
            lines: z.int().min(1).max(200).optional(),
          }),
        ]),
      ).optional(),
      captureZones: z.strictObject({ times: list(z.number().positive()).optional() }).optional(),
      drawdown: z.boolean().optional(),
    })
    .optional(),
})

export interface ModelFileError {
  path: string
  message: string
}

export type ParsedModelFile = { ok: true; model: Model } | { ok: false; errors: ModelFileError[] }

/**
 * Reads a model file that has been parsed as JSON. Nothing is filled in: what may be left out stays out, so the model
 * is the file and `modelHash` of either is the same. Every error carries its path, like `wells[0].rate`.
 */
export function parseModelFile(json: unknown): ParsedModelFile {
  const parsed = modelFile.safeParse(json)
  if (parsed.success) return { ok: true, model: parsed.data satisfies Model }
  return { ok: false, errors: parsed.error.issues.flatMap((issue) => errorsOf(issue, [], json)) }
}

type Issue = z.core.$ZodIssue

function errorsOf(issue: Issue, before: PropertyKey[], json: unknown): ModelFileError[] {
  const path = [...before, ...issue.path]
  if (issue.code === 'unrecognized_keys') {
    return issue.keys.slice(0, mostNamed).map((key) => ({
      path: written([...path, key]),
      message: 'is not a field of the model file',
    }))
  }
  if (issue.code === 'invalid_union' && issue.errors.length > 0) {
    // Of the alternatives, the one that came furthest says best what is wrong.
    const depth = (issues: Issue[]) => Math.max(0, ...issues.map((inner) => inner.path.length))
    const cost = (issues: Issue[]) =>
      issues.reduce((sum, inner) => sum + (inner.code === 'unrecognized_keys' ? inner.keys.length : 1), 0)
    const nearest = [...issue.errors].sort((a, b) => depth(b) - depth(a) || cost(a) - cost(b))[0] as Issue[]
    return nearest.flatMap((inner) => errorsOf(inner, path, json))
  }
  if (issue.code === 'invalid_type' && at(json, path) === undefined) {
    return [{ path: written(path), message: 'is needed' }]
  }
  return [{ path: written(path), message: issue.message }]
}

function at(json: unknown, path: PropertyKey[]): unknown {
  let value: unknown = json
  for (const key of path) {
    if (typeof value !== 'object' || value === null) return undefined
    value = (value as Record<PropertyKey, unknown>)[key]
  }
  return value
}

function written(path: PropertyKey[]): string {
  let text = ''
  for (const key of path) {
    if (typeof key === 'number') text += `[${key}]`
    else text += text === '' ? String(key) : `.${String(key)}`
  }
  return text === '' ? 'the file' : text
}
