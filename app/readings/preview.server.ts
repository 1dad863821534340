import type { Readable } from 'node:stream'
import { listRows } from '~/book/rows.server'
import { getObjectStream } from '~/files/files.server'
import type { Project } from '~/projects/project'
import type { Database } from '~database/connection.server'
import { fileRows } from './file-rows.server'
import type {
  ImportCounts,
  ImportPreview,
  ImportSettings,
  InstrumentSummary,
  NewInstrument,
} from './import-settings'
import type { Instrument } from './instrument'
import { RowReader } from './read-row'
import { provenOrder, TimeWitness } from './read-time'
import { type DecimalMark, noDecimalProof, provenDecimal, weighDecimal } from './read-value'
import { readStatus } from './reading'
import type { DateOrder } from './time-rules'

/** Somebody asked the preview to stop. */
export class Stopped extends Error {}

export interface Progress {
  step: 'reading' | 'checking' | 'storing'
  rows: number
  percent: number
}

export interface PreviewRequest {
  importId: number
  project: Pick<Project, 'id' | 'timeZone' | 'units'>
  file: { key: string; bytes: number }
  settings: ImportSettings
  now: Date
  report: (progress: Progress) => void
  stopped: () => boolean
}

const batchSize = 2000
const listed = 200

/**
 * Reads a stored file twice, as a stream: once to prove the order of its dates and its decimal mark over all rows, once to
 * stage every row with its outcome. Replaces what an earlier preview of the import staged. Stores nothing else.
 * Throws UnreadableFile and Stopped.
 */
export async function previewFile(db: Database, request: PreviewRequest): Promise<ImportPreview> {
  await db('reading_staging').where({ import_id: request.importId }).delete()
  const proof = await proveFile(request)
  const { settings } = request
  const preview = emptyPreview(settings, proof)
  if (preview.question) return preview

  const instruments = await listRows<Instrument>(db, request.project.id, 'instrument')
  const reader = new RowReader(settings, {
    instruments: instruments.map((row) => ({
      id: row.id,
      name: row.body.name,
      x: row.body.x,
      y: row.body.y,
      installedOn: row.body.installedOn,
    })),
    siteZone: request.project.timeZone,
    units: request.project.units,
    now: request.now,
    rows: proof.rows,
    order: proof.order,
    decimalMark: proof.decimalMark ?? 'point',
  })
  await stageRows(db, request, reader, proof.rows)
  await refuseContradictions(db, request.importId)
  await settle(db, request.importId)
  return {
    ...preview,
    ...(await summary(db, request.importId, instruments.map(nameOf), reader.added)),
    newInstruments: reader.added,
    unknownNames: [...reader.unknown].map(([name, rows]) => ({ name, rows })).sort((a, b) => b.rows - a.rows),
    otherWords: [...reader.otherWords].map(([word, rows]) => ({ word, rows })),
  }
}

function nameOf(row: { id: string; body: Instrument }) {
  return { id: row.id, name: row.body.name }
}

interface FileProof {
  rows: number
  blank: number
  unreadable: number
  order: DateOrder | null
  orderProven: boolean
  times: ReturnType<TimeWitness['proof']>
  decimalMark: DecimalMark | null
  decimalProven: boolean
  decimals: ReturnType<typeof noDecimalProof>
}

async function proveFile(request: PreviewRequest): Promise<FileProof> {
  const { settings } = request
  const witness = new TimeWitness(request.now)
  const decimals = noDecimalProof()
  const nameColumn = settings.instruments.by === 'column' ? settings.instruments.column : null
  const places = settings.instruments.by === 'one' ? null : settings.instruments.places
  let rows = 0
  let blank = 0
  let unreadable = 0
  for await (const { cells, row, blank: isBlank } of rowsBelowHeader(request, 'reading', 0, 35)) {
    if (isBlank) {
      blank++
      continue
    }
    rows++
    if (rows % 5000 === 0 && request.stopped()) throw new Stopped()
    if (cells.some((cell) => cell.includes('\ufffd'))) unreadable++
    if (settings.times.by === 'columns') {
      const time = settings.times.time === null ? '' : (cells[settings.times.time] ?? '')
      witness.weigh(
        cells[settings.times.date] ?? '',
        time,
        nameColumn === null ? '' : (cells[nameColumn] ?? ''),
      )
    }
    const value = cells[settings.value.column] ?? ''
    if (value.trim() !== '' && !readStatus(value)) weighDecimal(decimals, value)
    if (places) for (const column of [places.x, places.y]) weighDecimal(decimals, cells[column] ?? '')
    if (row > 20_000_000) throw new Stopped()
  }
  const times = witness.proof()
  const order = provenOrder(times)
  const mark = provenDecimal(decimals)
  return {
    rows,
    blank,
    unreadable,
    order: settings.times.by === 'fixed' ? null : (settings.times.order ?? order),
    orderProven:
      order !== null && (settings.times.by === 'fixed' || (settings.times.order ?? order) === order),
    times,
    decimalMark: settings.value.decimalMark ?? mark,
    decimalProven: decimals.point + decimals.comma > 0,
    decimals,
  }
}

async function* rowsBelowHeader(
  request: PreviewRequest,
  step: Progress['step'],
  fromPercent: number,
  toPercent: number,
) {
  const body: Readable = await getObjectStream(request.file.key)
  let bytes = 0
  let told = 0
  let rows = 0
  for await (const row of fileRows(body, request.settings, (count) => {
    bytes += count
  })) {
    if (row.row <= request.settings.headerRow) continue
    rows++
    if (rows % 1000 === 0 && Date.now() - told > 300) {
      told = Date.now()
      const share = Math.min(1, bytes / Math.max(1, request.file.bytes))
      request.report({ step, rows, percent: Math.round(fromPercent + share * (toPercent - fromPercent)) })
    }
    yield row
  }
}

function emptyPreview(settings: ImportSettings, proof: FileProof): ImportPreview {
  const undecided = settings.times.by === 'columns' && proof.order === null && proof.times.tallies.length > 1
  return {
    question: undecided ? 'date order' : proof.decimalMark === null ? 'decimal mark' : null,
    counts: { rows: proof.rows, accepted: 0, identical: 0, conflicts: 0, refused: 0 },
    blank: proof.blank,
    repeated: 0,
    statuses: {},
    bounds: 0,
    otherWords: [],
    reasons: [],
    refusedRows: [],
    conflictRows: [],
    instruments: [],
    newInstruments: [],
    unknownNames: [],
    dates:
      settings.times.by === 'fixed'
        ? null
        : {
            chosen: proof.order,
            proven: proof.orderProven,
            tallies: proof.times.tallies.map((tally) => ({
              order: tally.order,
              fits: tally.fits,
              backwards: tally.backwards,
              first: tally.first === null ? null : new Date(tally.first).toISOString(),
              last: tally.last === null ? null : new Date(tally.last).toISOString(),
            })),
            withOffset: proof.times.withOffset,
            dateOnly: proof.times.dateOnly,
          },
    decimals: {
      chosen: proof.decimalMark,
      proven: proof.decimalProven,
      point: proof.decimals.point,
      comma: proof.decimals.comma,
      either: proof.decimals.either,
    },
    unreadable: proof.unreadable,
  }
}

async function stageRows(
  db: Database,
  request: PreviewRequest,
  reader: RowReader,
  total: number,
): Promise<void> {
  const { settings } = request
  let batch: Record<string, unknown>[] = []
  let number = 0
  for await (const { cells, row, blank } of rowsBelowHeader(request, 'checking', 35, 95)) {
    if (blank) continue
    number++
    const read = reader.read(cells, row, number)
    batch.push({
      import_id: request.importId,
      file_row: row,
      project_id: request.project.id,
      instrument_id: read.ok ? read.instrumentId : null,
      quantity: read.ok ? read.quantity : null,
      taken_at: read.ok ? new Date(read.at) : null,
      value: read.ok ? read.value : null,
      entered: (read.ok ? read.entered : read.cells).slice(0, 200),
      unit: read.ok ? settings.value.unit : null,
      operator: read.ok ? read.operator : null,
      status: read.ok ? read.status : null,
      refusal: read.ok ? null : read.reason.slice(0, 300),
      outcome: read.ok ? null : 'refused',
    })
    if (batch.length >= batchSize) {
      if (request.stopped()) throw new Stopped()
      await db('reading_staging').insert(batch)
      batch = []
    }
  }
  if (batch.length > 0) await db('reading_staging').insert(batch)
  request.report({ step: 'storing', rows: total, percent: 96 })
}

/** One value again under another unit's rounding is the same value: a nanometre apart at most. */
const sameReading = (a: string, b: string) =>
  `(${a}.status <=> ${b}.status and ${a}.operator <=> ${b}.operator and (${a}.value <=> ${b}.value or abs(${a}.value - ${b}.value) <= 1e-9))`

/** Within a file the first row of a key counts: a later one repeats it or contradicts it. */
async function refuseContradictions(db: Database, importId: number): Promise<void> {
  await db.raw(
    `update reading_staging s
     join (
       select instrument_id, taken_at, quantity, min(file_row) as first_row
       from reading_staging where import_id = :importId and refusal is null
       group by instrument_id, taken_at, quantity having count(*) > 1
     ) d on d.instrument_id = s.instrument_id and d.taken_at = s.taken_at and d.quantity = s.quantity
     join reading_staging f on f.import_id = s.import_id and f.file_row = d.first_row
     set s.refusal = if(${sameReading('s', 'f')}, null, concat('Row ', d.first_row, ' of this file has another value for the same time.')),
         s.outcome = if(${sameReading('s', 'f')}, 'repeated', 'refused')
     where s.import_id = :importId and s.refusal is null and s.file_row > d.first_row`,
    { importId },
  )
}

/**
 * Holds every staged row that nothing speaks against to the readings there now: accepted, identical or conflict.
 * At commit it is done again, in the transaction.
 */
export async function settle(db: Database, importId: number): Promise<void> {
  await db.raw(
    `update reading_staging s
     left join readings r on r.project_id = s.project_id and r.instrument_id = s.instrument_id and r.quantity = s.quantity
       and r.taken_at = s.taken_at and r.revision = (
         select max(m.revision) from readings m
         where m.project_id = s.project_id and m.instrument_id = s.instrument_id and m.quantity = s.quantity and m.taken_at = s.taken_at
       )
     set s.outcome = case when r.instrument_id is null then 'accepted' when ${sameReading('s', 'r')} then 'identical' else 'conflict' end
     where s.import_id = :importId and s.refusal is null and not s.outcome <=> 'repeated'`,
    { importId },
  )
}

export async function countOutcomes(
  db: Database,
  importId: number,
): Promise<{ counts: ImportCounts; repeated: number }> {
  const rows = await db('reading_staging')
    .where({ import_id: importId })
    .groupBy('outcome')
    .select<{ outcome: string; rows: number }[]>('outcome', db.raw('count(*) as `rows`'))
  const of = (outcome: string) => Number(rows.find((row) => row.outcome === outcome)?.rows ?? 0)
  const counts = {
    rows: rows.reduce((sum, row) => sum + Number(row.rows), 0),
    accepted: of('accepted'),
    identical: of('identical') + of('repeated'),
    conflicts: of('conflict'),
    refused: of('refused'),
  }
  return { counts, repeated: of('repeated') }
}

/** Per instrument, what the rows with one of these outcomes hold. */
export async function summarise(
  db: Database,
  importId: number,
  names: { id: string; name: string }[],
  added: { id: string; name: string }[],
): Promise<InstrumentSummary[]> {
  const rows = await db('reading_staging')
    .where({ import_id: importId })
    .whereIn('outcome', ['accepted', 'identical', 'repeated', 'conflict'])
    .groupBy('instrument_id')
    .select<
      {
        instrument_id: string
        rows: number
        first: Date
        last: Date
        low: number | null
        high: number | null
      }[]
    >(
      'instrument_id',
      db.raw('count(*) as `rows`'),
      db.raw('min(taken_at) as `first`'),
      db.raw('max(taken_at) as `last`'),
      db.raw('min(value) as low'),
      db.raw('max(value) as high'),
    )
  const known = new Map([...names, ...added].map(({ id, name }) => [id, name]))
  const isNew = new Set(added.map(({ id }) => id))
  return rows
    .map((row) => ({
      id: row.instrument_id,
      name: known.get(row.instrument_id) ?? '–',
      isNew: isNew.has(row.instrument_id),
      rows: Number(row.rows),
      firstAt: row.first.toISOString(),
      lastAt: row.last.toISOString(),
      low: row.low,
      high: row.high,
    }))
    .sort((a, b) => a.name.localeCompare(b.name, 'en', { numeric: true }))
}

async function summary(
  db: Database,
  importId: number,
  names: { id: string; name: string }[],
  added: NewInstrument[],
) {
  const { counts, repeated } = await countOutcomes(db, importId)
  const staged = () => db('reading_staging').where({ import_id: importId })
  const reasons = await staged()
    .where('outcome', 'refused')
    .groupBy('refusal')
    .orderBy('rows', 'desc')
    .limit(50)
    .select<{ reason: string; rows: number }[]>('refusal as reason', db.raw('count(*) as `rows`'))
  const refusedRows = await staged()
    .where('outcome', 'refused')
    .orderBy('file_row')
    .limit(listed)
    .select<{ row: number; reason: string; cells: string }[]>(
      'file_row as row',
      'refusal as reason',
      'entered as cells',
    )
  const statuses = await staged()
    .whereNotNull('status')
    .groupBy('status')
    .select<{ status: string; rows: number }[]>('status', db.raw('count(*) as `rows`'))
  const [bounds] = await staged().whereNotNull('operator').count('* as rows')
  const known = new Map([...names, ...added].map(({ id, name }) => [id, name]))
  const conflicts = await conflictsOf(db, importId, listed)
  return {
    counts,
    repeated,
    statuses: Object.fromEntries(statuses.map(({ status, rows }) => [status, Number(rows)])),
    bounds: Number(bounds?.rows ?? 0),
    reasons: reasons.map(({ reason, rows }) => ({ reason, rows: Number(rows) })),
    refusedRows,
    conflictRows: conflicts.map((line) => ({
      row: line.file_row,
      instrument: known.get(line.instrument_id) ?? '–',
      at: line.taken_at.toISOString(),
      entered: line.entered,
      existing: line.existing,
      unit: line.unit,
    })),
    instruments: await summarise(db, importId, names, added),
  }
}

interface ConflictLine {
  file_row: number
  instrument_id: string
  taken_at: Date
  entered: string
  existing: string
  unit: string
}

/** Staged rows that contradict a reading, with what stands there. */
async function conflictsOf(db: Database, importId: number, most: number): Promise<ConflictLine[]> {
  const [rows] = await db.raw(
    `select s.file_row, s.instrument_id, s.taken_at, s.entered, s.unit,
       if(r.unit = s.unit or r.value is null, r.entered, concat(r.entered, ' ', r.unit)) as existing
     from reading_staging s
     join readings r on r.project_id = s.project_id and r.instrument_id = s.instrument_id and r.quantity = s.quantity
       and r.taken_at = s.taken_at and r.revision = (
         select max(m.revision) from readings m
         where m.project_id = s.project_id and m.instrument_id = s.instrument_id and m.quantity = s.quantity and m.taken_at = s.taken_at
       )
     where s.import_id = ? and s.outcome = 'conflict' order by s.file_row limit ?`,
    [importId, most],
  )
  return rows
}
