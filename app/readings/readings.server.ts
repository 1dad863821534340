import { listRows } from '~/book/rows.server'
import { convert } from '~/units'
import type { Database } from '~database/connection.server'
import {
  type DatedLevel,
  headOf,
  type LevelHistory,
  levelHistory,
  levelInForce,
  type StoredReading,
} from './heads-of-readings'
import type { Instrument, ReferenceLevel } from './instrument'
import type { Quality, ReadingQuantity } from './reading'
import { gaps, type SeriesPoint, thin } from './thin'

interface ReadingRow {
  instrument_id: string
  quantity: ReadingQuantity
  taken_at: Date
  value: number | null
  operator: string | null
  status: string | null
}

/** The revision in force of every reading: earlier ones stay in the table and are never shown as current. */
function currentReadings(db: Database, projectId: number) {
  return db('readings as r')
    .where('r.project_id', projectId)
    .whereNot('r.quality', 'rejected')
    .whereNotExists(
      db('readings as later')
        .whereRaw('later.project_id = r.project_id')
        .whereRaw('later.instrument_id = r.instrument_id')
        .whereRaw('later.quantity = r.quantity')
        .whereRaw('later.taken_at = r.taken_at')
        .whereRaw('later.revision > r.revision')
        .select(db.raw('1')),
    )
}

function asStored(row: ReadingRow): StoredReading {
  return {
    quantity: row.quantity,
    at: row.taken_at.getTime(),
    value: row.value,
    operator: row.operator,
    status: row.status,
  }
}

async function instrumentsOf(db: Database, projectId: number) {
  const rows = await listRows<Instrument>(db, projectId, 'instrument')
  return rows.map((row) => ({ id: row.id, ...row.body }))
}

/** The reference levels of every instrument of a project, by instrument, ready for deriving heads. */
export async function levelHistories(db: Database, projectId: number): Promise<Map<string, LevelHistory>> {
  const byInstrument = new Map<string, DatedLevel[]>()
  for (const { body } of await listRows<ReferenceLevel>(db, projectId, 'reference level')) {
    byInstrument.set(body.instrumentId, [...(byInstrument.get(body.instrumentId) ?? []), body])
  }
  return new Map([...byInstrument].map(([id, levels]) => [id, levelHistory(levels)]))
}

const noLevels: LevelHistory = { dip: [], sensor: [] }

/** Either the reading nearest to an instant, at most so many days away, or the mean of a window. */
export type MeasuredOn = { nearest: Date; withinDays: number } | { from: Date; to: Date }

export interface MeasuredHead {
  instrumentId: string
  name: string
  /** In the project's grid and length unit. */
  x: number
  y: number
  /** The named point of section 2 that stands for the instrument, if one was chosen. */
  pointId: string | null
  /** Metres above the vertical datum; null with the reason in `why`. */
  head: number | null
  why: string | null
  /** Readings behind the head: 1 for the nearest, all with a head for a window. */
  n: number
  low: number | null
  high: number | null
  /** First and last instant of those readings, ISO 8601 in UTC. */
  firstAt: string | null
  lastAt: string | null
}

interface Tally {
  n: number
  sum: number
  low: number
  high: number
  first: number
  last: number
  why: string | null
}

/**
 * The measured head of every instrument on a date or over a window, heads derived with the reference levels in force.
 * Rejected readings, statuses such as "dry" and bounds (< or >) give no head; an instrument without one stays in the list.
 */
export async function measuredHeads(
  db: Database,
  projectId: number,
  on: MeasuredOn,
): Promise<MeasuredHead[]> {
  const reach = 'nearest' in on ? on.withinDays * 86_400_000 : 0
  const from = 'nearest' in on ? new Date(on.nearest.getTime() - reach) : on.from
  const to = 'nearest' in on ? new Date(on.nearest.getTime() + reach) : on.to
  const histories = await levelHistories(db, projectId)
  const tallies = new Map<string, Tally>()
  const rows = currentReadings(db, projectId)
    .whereBetween('r.taken_at', [from, to])
    .select('r.instrument_id', 'r.quantity', 'r.taken_at', 'r.value', 'r.operator', 'r.status')
    .stream()
  for await (const row of rows as AsyncIterable<ReadingRow>) {
    const reading = asStored(row)
    const { head, why } = headOf(reading, histories.get(row.instrument_id) ?? noLevels)
    const tally = tallies.get(row.instrument_id) ?? emptyTally()
    tallies.set(row.instrument_id, tally)
    if (head === null) tally.why ??= why
    else if ('nearest' in on) keepNearest(tally, reading.at, head, on.nearest.getTime())
    else addHead(tally, reading.at, head)
  }
  const instruments = await instrumentsOf(db, projectId)
  return instruments.map(({ id, name, x, y, pointId }) => {
    const tally = tallies.get(id)
    const identity = { instrumentId: id, name, x, y, pointId }
    if (!tally || tally.n === 0) {
      const none = { head: null, n: 0, low: null, high: null, firstAt: null, lastAt: null }
      return { ...identity, ...none, why: tally?.why ?? 'no reading' }
    }
    return {
      ...identity,
      head: tally.sum / tally.n,
      why: null,
      n: tally.n,
      low: tally.low,
      high: tally.high,
      firstAt: new Date(tally.first).toISOString(),
      lastAt: new Date(tally.last).toISOString(),
    }
  })
}

function emptyTally(): Tally {
  return { n: 0, sum: 0, low: Infinity, high: -Infinity, first: Infinity, last: -Infinity, why: null }
}

function addHead(tally: Tally, at: number, head: number): void {
  tally.n++
  tally.sum += head
  tally.low = Math.min(tally.low, head)
  tally.high = Math.max(tally.high, head)
  tally.first = Math.min(tally.first, at)
  tally.last = Math.max(tally.last, at)
}

function keepNearest(tally: Tally, at: number, head: number, wanted: number): void {
  if (tally.n === 1 && Math.abs(tally.first - wanted) <= Math.abs(at - wanted)) return
  Object.assign(tally, { n: 1, sum: head, low: head, high: head, first: at, last: at })
}

export interface LastReading {
  instrumentId: string
  name: string
  kind: Instrument['kind']
  x: number
  y: number
  outOfService: boolean
  /** Readings in force. */
  count: number
  /** The newest reading of any sort; null when there is none. */
  last: {
    at: string
    quantity: ReadingQuantity
    /** As the file has it, in `unit`. */
    entered: string
    unit: string
    operator: string | null
    status: string | null
    quality: Quality
    /** Metres above the vertical datum, null with the reason in `why`. */
    head: number | null
    why: string | null
  } | null
  /** The newest reading that gives a head. */
  lastHead: { at: string; head: number } | null
}

export interface ReadingSpan {
  count: number
  /** ISO 8601 in UTC. */
  first: string
  last: string
}

/** How many readings each instrument has, and from when to when; instruments without any are left out. */
export async function firstAndLast(db: Database, projectId: number): Promise<Map<string, ReadingSpan>> {
  const rows = await currentReadings(db, projectId)
    .groupBy('r.instrument_id')
    .select<{ instrument_id: string; count: number; first: Date; last: Date }[]>(
      'r.instrument_id',
      db.raw('count(*) as count'),
      db.raw('min(r.taken_at) as `first`'),
      db.raw('max(r.taken_at) as `last`'),
    )
  return new Map(
    rows.map((row) => [
      row.instrument_id,
      { count: Number(row.count), first: row.first.toISOString(), last: row.last.toISOString() },
    ]),
  )
}

/** The last reading and the last head of every instrument, in the order of the sheet. */
export async function lastReadings(db: Database, projectId: number): Promise<LastReading[]> {
  const histories = await levelHistories(db, projectId)
  const spans = await firstAndLast(db, projectId)
  const instruments = await instrumentsOf(db, projectId)
  const answers: LastReading[] = []
  for (const { id, name, kind, x, y, outOfService } of instruments) {
    const history = histories.get(id) ?? noLevels
    const newest = () =>
      currentReadings(db, projectId).where('r.instrument_id', id).orderBy('r.taken_at', 'desc')
    const row = await newest().first<LastRow | undefined>('r.*')
    let lastHead: LastReading['lastHead'] = null
    const derived = row && headOf(asStored(row), history)
    if (row && derived?.head !== null && derived?.head !== undefined) {
      lastHead = { at: row.taken_at.toISOString(), head: derived.head }
    } else if (row) {
      // A hundred readings back is far enough: before that a head is history, not news.
      const candidates = await newest()
        .whereNotNull('r.value')
        .whereNull('r.operator')
        .limit(100)
        .select<LastRow[]>('r.*')
      for (const candidate of candidates) {
        const { head } = headOf(asStored(candidate), history)
        if (head === null) continue
        lastHead = { at: candidate.taken_at.toISOString(), head }
        break
      }
    }
    answers.push({
      instrumentId: id,
      name,
      kind,
      x,
      y,
      outOfService,
      count: spans.get(id)?.count ?? 0,
      last:
        row && derived
          ? {
              at: row.taken_at.toISOString(),
              quantity: row.quantity,
              entered: row.entered,
              unit: row.unit,
              operator: row.operator,
              status: row.status,
              quality: row.quality,
              head: derived.head,
              why: derived.why,
            }
          : null,
      lastHead,
    })
  }
  return answers
}

interface LastRow extends ReadingRow {
  entered: string
  unit: string
  quality: Quality
}

/** Heads that came from one quantity: a logger's levels are one line, the dips that check it another. */
export interface SeriesLine {
  quantity: ReadingQuantity
  /** Heads in metres above the vertical datum, thinned. */
  points: SeriesPoint[]
  /** Readings with a head, before thinning. */
  total: number
  /** Instants after which the line breaks, because readings are missing. */
  gaps: number[]
}

export interface Series {
  /** The one with most readings first. */
  lines: SeriesLine[]
  /** Readings that give no head, or a number with a caution. */
  marks: { at: number; word: string; entered: string; head: number | null }[]
  /** Changes of a reference level within the span, with its level in metres. */
  levels: { at: number; level: number; levelled: string; reason: string }[]
}

const mostMarks = 400

/** The hydrograph of one instrument, each line thinned to `maxPoints` without losing a peak or a trough. */
export async function seriesOf(
  db: Database,
  projectId: number,
  instrumentId: string,
  span: { from?: Date; to?: Date; maxPoints: number },
): Promise<Series> {
  const rows = (await listRows<ReferenceLevel>(db, projectId, 'reference level')).filter(
    (row) => row.body.instrumentId === instrumentId,
  )
  const history = levelHistory(rows.map((row) => row.body))
  const query = currentReadings(db, projectId)
    .where('r.instrument_id', instrumentId)
    .orderBy('r.taken_at')
    .select('r.instrument_id', 'r.quantity', 'r.taken_at', 'r.value', 'r.operator', 'r.status', 'r.entered')
  if (span.from) query.where('r.taken_at', '>=', span.from)
  if (span.to) query.where('r.taken_at', '<=', span.to)
  const heads = new Map<ReadingQuantity, SeriesPoint[]>()
  const marks: Series['marks'] = []
  for await (const row of query.stream() as AsyncIterable<ReadingRow & { entered: string }>) {
    const { head, why } = headOf(asStored(row), history)
    const at = row.taken_at.getTime()
    if (head !== null) {
      const points = heads.get(row.quantity) ?? []
      heads.set(row.quantity, points)
      points.push([at, head])
    }
    const word =
      row.status ?? (head === null ? (row.operator ? `${row.operator} ${row.entered}` : why) : null)
    if (word !== null && marks.length < mostMarks) marks.push({ at, word, entered: row.entered, head })
  }
  const steps = [...history.dip, ...history.sensor]
  const inSpan = (at: number) =>
    (!span.from || at >= span.from.getTime()) && (!span.to || at <= span.to.getTime())
  return {
    lines: [...heads]
      .map(([quantity, points]) => ({
        quantity,
        points: thin(points, span.maxPoints),
        total: points.length,
        gaps: gaps(points),
      }))
      .sort((a, b) => b.total - a.total),
    marks,
    levels: steps
      .filter((step) => inSpan(step.from))
      .map((step) => ({
        at: step.from,
        level: step.level,
        levelled: step.source.levelled,
        reason: rows.find((row) => row.body === step.source)?.body.reason ?? '',
      })),
  }
}

/** A reading with everything it came from. */
export interface TracedReading {
  at: string
  quantity: ReadingQuantity
  entered: string
  unit: string
  operator: string | null
  status: string | null
  quality: Quality
  revision: number
  head: number | null
  why: string | null
  /** The reference level that the head was derived with. */
  reference: DatedLevel | null
  importId: number
  file: string
  fileRow: number | null
}

/** The newest readings of one instrument, each with its file, row, entered text and reference level. */
export async function latestReadings(
  db: Database,
  projectId: number,
  instrumentId: string,
  most: number,
): Promise<TracedReading[]> {
  const history = (await levelHistories(db, projectId)).get(instrumentId) ?? noLevels
  const rows = await currentReadings(db, projectId)
    .where('r.instrument_id', instrumentId)
    .join('imports', 'imports.id', 'r.import_id')
    .join('files', 'files.id', 'imports.file_id')
    .orderBy('r.taken_at', 'desc')
    .limit(most)
    .select<
      (LastRow & { revision: number; import_id: number; file_row: number | null; file_name: string })[]
    >('r.*', 'files.name as file_name')
  return rows.map((row) => {
    const reading = asStored(row)
    const { head, why } = headOf(reading, history)
    const uses = row.quantity !== 'level' && head !== null
    return {
      at: row.taken_at.toISOString(),
      quantity: row.quantity,
      entered: row.entered,
      unit: row.unit,
      operator: row.operator,
      status: row.status,
      quality: row.quality,
      revision: row.revision,
      head,
      why,
      reference: uses ? (levelInForce(history, row.quantity, reading.at) ?? null) : null,
      importId: row.import_id,
      file: row.file_name,
      fileRow: row.file_row,
    }
  })
}

/**
 * The course of heads of every instrument in at most so many points: the first number of each equal span of time.
 * For small pictures only; `seriesOf` has every peak.
 */
export async function coursesOf(
  db: Database,
  projectId: number,
  options: { from: Date; to: Date; points: number },
): Promise<Map<string, SeriesPoint[]>> {
  const histories = await levelHistories(db, projectId)
  const width = Math.max(60, (options.to.getTime() - options.from.getTime()) / 1000 / options.points)
  const firsts = db('readings')
    .where({ project_id: projectId })
    .whereBetween('taken_at', [options.from, options.to])
    .whereNotNull('value')
    .groupByRaw('instrument_id, floor(timestampdiff(second, ?, taken_at) / ?)', [options.from, width])
    .select('instrument_id', db.raw('min(taken_at) as taken_at'))
    .as('f')
  const rows: ReadingRow[] = await currentReadings(db, projectId)
    .join(firsts, (join) => join.on('f.instrument_id', 'r.instrument_id').andOn('f.taken_at', 'r.taken_at'))
    .orderBy('r.taken_at')
    .select('r.instrument_id', 'r.quantity', 'r.taken_at', 'r.value', 'r.operator', 'r.status')
  const courses = new Map<string, SeriesPoint[]>()
  for (const row of rows) {
    const { head } = headOf(asStored(row), histories.get(row.instrument_id) ?? noLevels)
    if (head === null) continue
    courses.set(row.instrument_id, [
      ...(courses.get(row.instrument_id) ?? []),
      [row.taken_at.getTime(), head],
    ])
  }
  return courses
}

/** The reference level that a dip (or, failing that, a sensor) has in force at an instant, in metres, by instrument. */
export async function currentReferenceLevels(
  db: Database,
  projectId: number,
  at: Date,
): Promise<Map<string, number>> {
  const levels = new Map<string, number>()
  for (const [id, history] of await levelHistories(db, projectId)) {
    const inForce =
      levelInForce(history, 'dip', at.getTime()) ?? levelInForce(history, 'pressure head', at.getTime())
    if (inForce) levels.set(id, convert(inForce.level, 'm'))
  }
  return levels
}
