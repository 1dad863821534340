import { z } from 'zod'
import { coordinate, quantity, source, text } from '~/book/field'

export const instrumentKinds = ['standpipe', 'standpipe piezometer', 'vibrating-wire', 'logger'] as const

/** A piezometer or standpipe: where it is and what ground its response zone answers for. */
export const instrumentSchema = z.strictObject({
  name: text(40, 'Name the instrument.'),
  kind: z.enum(instrumentKinds, { error: 'Choose the kind of instrument.' }),
  x: coordinate,
  y: coordinate,
  groundLevel: quantity('length').nullable().default(null),
  responseTop: quantity('length').nullable().default(null),
  responseBase: quantity('length').nullable().default(null),
  serial: text(60).default(''),
  /** A sheet's empty cell is ''. */
  installedOn: z.preprocess(
    (value) => (value === '' ? null : value),
    z.iso.date('Give a date such as 2026-03-14.').nullable().default(null),
  ),
  /** The named point of section 2 whose modelled head this instrument is compared with. */
  pointId: z.string().nullable().default(null),
  /** True once the instrument is out of service. */
  outOfService: z.boolean().default(false),
  source,
})
export type Instrument = z.infer<typeof instrumentSchema>

export const levelledParts = ['pipe top', 'cover', 'ground', 'flange', 'sensor'] as const

/** The level that dips are measured from (or the sensor's own level), in force from an instant until the next one. */
export const referenceLevelSchema = z.strictObject({
  instrumentId: z.string({ error: 'Choose the instrument.' }).min(1, 'Choose the instrument.'),
  from: z.iso.datetime({ offset: true, error: 'Give a date and time with its offset.' }),
  level: quantity('length'),
  levelled: z.enum(levelledParts, { error: 'Say what was levelled.' }),
  reason: text(500, 'Give the reason: first survey, casing cut, resurvey.'),
  source,
})
export type ReferenceLevel = z.infer<typeof referenceLevelSchema>
