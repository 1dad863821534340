import { z } from 'zod'
import { list } from '~/book/list'
import { isUnitName, type UnitName } from '~/units'
import { delimiters, encodings } from './file-format'
import { instrumentKinds } from './instrument'
import { decimalMarks } from './read-value'
import { quantities, unitsOfQuantity } from './reading'
import { dateOrders } from './time-rules'

const column = (what: string) =>
  z
    .number({ error: `Choose the column of ${what}.` })
    .int()
    .min(0)
    .max(499)

const lengthUnit = z
  .string({ error: 'Choose the unit of the coordinates.' })
  .refine((unit) => unit === 'm' || unit === 'km' || unit === 'ft' || unit === 'ftUS', {
    error: 'Choose the unit of the coordinates.',
  })
  .transform((unit) => unit as UnitName)

const clock = z.string().regex(/^([01]\d|2[0-3]):[0-5]\d$/, 'Give a time such as 12:00.')

/** Columns and words for instruments that the file brings with it. */
const placesSchema = z.object({
  x: column('x'),
  y: column('y'),
  unit: lengthUnit,
  kind: z.enum(instrumentKinds, { error: 'Choose the kind of the new instruments.' }),
})

const instrumentsSchema = z.discriminatedUnion('by', [
  z.object({
    by: z.literal('column'),
    column: column('the instrument'),
    /** By a name in the file that is no instrument: the id of the one meant, 'add' for a new one, or 'leave out'. */
    names: z.record(z.string().max(200), z.string().max(60)).default({}),
    places: placesSchema.nullable().default(null),
  }),
  z.object({
    by: z.literal('one'),
    instrumentId: z.string({ error: 'Choose the instrument.' }).min(1, 'Choose the instrument.'),
  }),
  z.object({
    by: z.literal('row'),
    prefix: z.string().trim().min(1, 'Give a prefix, such as OW.').max(20, 'At most 20 characters.'),
    places: placesSchema,
  }),
])

const timesSchema = z.discriminatedUnion('by', [
  z.object({
    by: z.literal('columns'),
    date: column('the date'),
    time: column('the time').nullable().default(null),
    /** Null: as the file proves it. */
    order: z.enum(dateOrders).nullable().default(null),
    /** Time of day of rows that have a date only; null refuses them. */
    timeIfNone: clock.nullable().default(null),
  }),
  z.object({ by: z.literal('fixed'), date: z.iso.date('Give the date of the readings.'), time: clock }),
])

const zoneSchema = z.discriminatedUnion(
  'rule',
  [
    z.object({ rule: z.literal('utc') }),
    z.object({
      rule: z.literal('offset'),
      minutes: z.number({ error: 'Give the hours from UTC.' }).int().min(-840).max(840),
    }),
    z.object({ rule: z.literal('site'), repeated: z.enum(['refuse', 'first', 'second', 'in order']) }),
    z.object({ rule: z.literal('written') }),
  ],
  { error: 'Choose the time zone rule.' },
)

/** How a file is to be read. Quantity, unit and time zone rule have no default: somebody has to say them. */
export const importSettingsSchema = z
  .object({
    encoding: z.enum(encodings),
    delimiter: z.enum(delimiters),
    /** Row, counted from 1, that names the columns; readings start below it. 0 for none. */
    headerRow: z
      .number({ error: 'Give the number of the row with the column names.' })
      .int()
      .min(0)
      .max(1000),
    instruments: instrumentsSchema,
    times: timesSchema,
    zone: zoneSchema,
    value: z.object({
      column: column('the value'),
      quantity: z.enum(quantities, { error: 'Choose what was measured.' }),
      unit: z
        .string({ error: 'Choose the unit.' })
        .refine(isUnitName, 'Choose the unit.')
        .transform((unit) => unit as UnitName),
      /** Null: as the file proves it. */
      decimalMark: z.enum(decimalMarks).nullable().default(null),
      status: column('the status').nullable().default(null),
    }),
    /** The cells of the header row, by which a later file of the same make is recognised. */
    header: list(z.string().max(200), { most: 500 }).default([]),
  })
  .refine((s) => unitsOfQuantity(s.value.quantity).includes(s.value.unit), {
    path: ['value', 'unit'],
    error: 'This unit does not belong to what was measured.',
  })
export type ImportSettings = z.infer<typeof importSettingsSchema>

/** Messages by the path of the field, "value.unit". */
export type SettingsProblems = Record<string, string>

export function settingsProblems(error: z.ZodError): SettingsProblems {
  const problems: SettingsProblems = {}
  for (const issue of error.issues) problems[issue.path.join('.')] ??= issue.message
  return problems
}

export interface RefusedRow {
  row: number
  reason: string
  /** The cells that the refusal is about, as they stand in the file. */
  cells: string
}

export interface ConflictRow {
  row: number
  instrument: string
  at: string
  entered: string
  existing: string
  unit: string
}

export interface InstrumentSummary {
  id: string
  name: string
  isNew: boolean
  rows: number
  firstAt: string
  lastAt: string
  /** In metres, of the quantity of the file; null where only statuses came. */
  low: number | null
  high: number | null
}

export interface ImportCounts {
  /** Rows below the header that hold anything: the sum of the others. */
  rows: number
  accepted: number
  /** Already there, or repeated in the file, with the same value. */
  identical: number
  /** There with another value. */
  conflicts: number
  refused: number
}

export interface NewInstrument {
  id: string
  name: string
  kind: (typeof instrumentKinds)[number]
  x: number
  y: number
  row: number
}

/** What a file would do, before anything is done. */
export interface ImportPreview {
  /** What must be chosen before the file can be read; nothing is counted then. */
  question: 'date order' | 'decimal mark' | null
  counts: ImportCounts
  blank: number
  repeated: number
  statuses: Record<string, number>
  /** Values known only as a bound, < or >. */
  bounds: number
  /** Words of the status column that are no status: the number was taken, the word was not. */
  otherWords: { word: string; rows: number }[]
  reasons: { reason: string; rows: number }[]
  refusedRows: RefusedRow[]
  conflictRows: ConflictRow[]
  instruments: InstrumentSummary[]
  newInstruments: NewInstrument[]
  /** Names in the file that are no instrument, with their rows. */
  unknownNames: { name: string; rows: number }[]
  dates: {
    chosen: string | null
    proven: boolean
    tallies: { order: string; fits: number; backwards: number; first: string | null; last: string | null }[]
    withOffset: number
    dateOnly: number
  } | null
  decimals: { chosen: string | null; proven: boolean; point: number; comma: number; either: number }
  /** Rows with characters that the encoding does not know. */
  unreadable: number
}

/** What an import did, kept with it for good. */
export interface ImportReceipt {
  file: { name: string; bytes: number; sha256: string }
  counts: ImportCounts
  /** Conflicts taken as new revisions: part of `conflicts`. */
  superseded: number
  conflictRule: 'keep' | 'take new'
  reason: string | null
  instruments: InstrumentSummary[]
  addedInstruments: { id: string; name: string }[]
  reasons: { reason: string; rows: number }[]
  committedAt: string
  committedBy: string
}
