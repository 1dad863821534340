import { randomUUID } from 'node:crypto'
import { convert, type ProjectUnits } from '~/units'
import type { ImportSettings, NewInstrument } from './import-settings'
import { Clockwork, readTime } from './read-time'
import { type DecimalMark, readNumber, readValue, shorten } from './read-value'
import { type ReadingQuantity, type ReadingStatus, readStatus } from './reading'
import type { DateOrder } from './time-rules'

/** What the rows of a file are held against. */
export interface ReadingContext {
  instruments: { id: string; name: string; x: number; y: number; installedOn: string | null }[]
  siteZone: string
  units: ProjectUnits
  now: Date
  /** Rows below the header, for the digits of generated names. */
  rows: number
  order: DateOrder | null
  decimalMark: DecimalMark
}

export interface AcceptedRow {
  ok: true
  instrumentId: string
  at: number
  quantity: ReadingQuantity
  value: number | null
  entered: string
  operator: '<' | '>' | null
  status: ReadingStatus | null
}

export interface RefusedReading {
  ok: false
  reason: string
  cells: string
}

interface Known {
  id: string
  name: string
  x: number
  y: number
  /** Start of the day of installation at the site. */
  from: number | null
}

const mostNewInstruments = 2000

function keyOf(name: string): string {
  return name.trim().toLowerCase()
}

/** Reads the rows of one file, one after another, under settings that have no open question. */
export class RowReader {
  private readonly clockwork: Clockwork
  private readonly byName = new Map<string, Known>()
  private readonly byId = new Map<string, Known>()
  private readonly answers = new Map<string, string>()
  /** Instruments that the rows brought so far. */
  readonly added: NewInstrument[] = []
  /** Rows by names that are no instrument. */
  readonly unknown = new Map<string, number>()
  /** Words of the status column that are no status, with their rows. */
  readonly otherWords = new Map<string, number>()

  constructor(
    private readonly settings: ImportSettings,
    private readonly context: ReadingContext,
  ) {
    this.clockwork = new Clockwork(settings.zone, context.siteZone)
    const site = new Clockwork({ rule: 'site', repeated: 'first' }, context.siteZone)
    for (const instrument of context.instruments) {
      let from: number | null = null
      if (instrument.installedOn) {
        const midnight = Date.parse(`${instrument.installedOn}T00:00:00Z`)
        const start = site.instant({ clock: midnight, hasTime: true, offset: null }, '')
        from = start.ok ? start.at : midnight
      }
      const known = { id: instrument.id, name: instrument.name, x: instrument.x, y: instrument.y, from }
      this.byName.set(keyOf(instrument.name), known)
      this.byId.set(instrument.id, known)
    }
    if (settings.instruments.by === 'column') {
      for (const [name, answer] of Object.entries(settings.instruments.names)) {
        this.answers.set(keyOf(name), answer)
      }
    }
  }

  /** `number` is the row's number among those below the header, from 1; `row` its number in the file. */
  read(cells: readonly string[], row: number, number: number): AcceptedRow | RefusedReading {
    const { value } = this.settings
    const instrument = this.instrument(cells, row, number)
    if (!instrument.ok) return instrument
    const at = this.time(cells, instrument.known.id)
    if (!at.ok) return at
    if (at.at > this.context.now.getTime()) {
      return { ok: false, reason: 'The time lies in the future.', cells: at.cells }
    }
    if (instrument.known.from !== null && at.at < instrument.known.from) {
      return { ok: false, reason: `${instrument.known.name} was not installed yet.`, cells: at.cells }
    }
    const entered = (cells[value.column] ?? '').trim()
    const statusText = value.status === null ? '' : (cells[value.status] ?? '').trim()
    const besides = statusText === '' ? null : readStatus(statusText)
    if (statusText !== '' && !besides) {
      const word = shorten(statusText)
      if (this.otherWords.size < 50 || this.otherWords.has(word)) {
        this.otherWords.set(word, (this.otherWords.get(word) ?? 0) + 1)
      }
    }
    if (entered === '' && besides) {
      return this.accepted(instrument.known.id, at.at, null, besides, null, besides)
    }
    const read = readValue(entered, this.context.decimalMark, value.unit)
    if (!read.ok) return { ok: false, reason: read.reason, cells: entered }
    if (entered.length > 40)
      return { ok: false, reason: 'The value is longer than 40 characters.', cells: shorten(entered) }
    return this.accepted(
      instrument.known.id,
      at.at,
      read.value,
      entered,
      read.operator,
      read.status ?? besides,
    )
  }

  private accepted(
    instrumentId: string,
    at: number,
    value: number | null,
    entered: string,
    operator: '<' | '>' | null,
    status: ReadingStatus | null,
  ): AcceptedRow {
    return {
      ok: true,
      instrumentId,
      at,
      quantity: this.settings.value.quantity,
      value,
      entered,
      operator,
      status,
    }
  }

  private instrument(
    cells: readonly string[],
    row: number,
    number: number,
  ): { ok: true; known: Known } | RefusedReading {
    const { instruments } = this.settings
    if (instruments.by === 'one') {
      const known = this.byId.get(instruments.instrumentId)
      return known ? { ok: true, known } : { ok: false, reason: 'The chosen instrument is gone.', cells: '' }
    }
    if (instruments.by === 'row') {
      const digits = String(this.context.rows).length
      return this.place(
        `${instruments.prefix}-${String(number).padStart(digits, '0')}`,
        cells,
        row,
        instruments.places,
      )
    }
    const name = (cells[instruments.column] ?? '').trim()
    if (name === '') return { ok: false, reason: 'There is no instrument in this row.', cells: '' }
    const answer = this.answers.get(keyOf(name))
    if (answer === 'leave out') {
      return { ok: false, reason: `Rows of "${shorten(name)}" are left out, as chosen.`, cells: name }
    }
    if (answer === 'add' && instruments.places) return this.place(name, cells, row, instruments.places)
    const known = (answer && this.byId.get(answer)) || this.byName.get(keyOf(name))
    if (known) return { ok: true, known }
    if (this.unknown.size < 2000 || this.unknown.has(name)) {
      this.unknown.set(name, (this.unknown.get(name) ?? 0) + 1)
    }
    return { ok: false, reason: `No instrument is called "${shorten(name)}".`, cells: name }
  }

  /** The instrument of a name at a place: the known one if it stands there, a new one if there is none. */
  private place(
    name: string,
    cells: readonly string[],
    row: number,
    places: { x: number; y: number; unit: Parameters<typeof convert>[1]; kind: NewInstrument['kind'] },
  ): { ok: true; known: Known } | RefusedReading {
    const entered = [(cells[places.x] ?? '').trim(), (cells[places.y] ?? '').trim()] as const
    const x = readNumber(entered[0], this.context.decimalMark)
    const y = readNumber(entered[1], this.context.decimalMark)
    if (x === null || y === null) {
      return { ok: false, reason: 'The position is not two numbers.', cells: entered.join(', ') }
    }
    const unit = this.context.units.length
    const at = {
      x: convert({ value: x, unit: places.unit }, unit),
      y: convert({ value: y, unit: places.unit }, unit),
    }
    const known = this.byName.get(keyOf(name))
    if (known) {
      // A millimetre: positions went through decimal text once more.
      if (Math.hypot(known.x - at.x, known.y - at.y) <= 1e-3) return { ok: true, known }
      return { ok: false, reason: `${shorten(name)} stands at another position.`, cells: entered.join(', ') }
    }
    if (name.length > 40) {
      return { ok: false, reason: 'The name is longer than 40 characters.', cells: shorten(name) }
    }
    if (this.added.length >= mostNewInstruments) {
      return { ok: false, reason: `A file adds at most ${mostNewInstruments} instruments.`, cells: name }
    }
    const added: NewInstrument = { id: randomUUID(), name, kind: places.kind, ...at, row }
    this.added.push(added)
    const entry = { id: added.id, name, ...at, from: null }
    this.byName.set(keyOf(name), entry)
    this.byId.set(added.id, entry)
    return { ok: true, known: entry }
  }

  private time(
    cells: readonly string[],
    instrumentId: string,
  ): { ok: true; at: number; cells: string } | RefusedReading {
    const { times } = this.settings
    if (times.by === 'fixed') {
      const clock = Date.parse(`${times.date}T${times.time}:00Z`)
      const instant = this.clockwork.instant({ clock, hasTime: true, offset: null }, instrumentId)
      return { ...instant, cells: `${times.date} ${times.time}` }
    }
    const date = cells[times.date] ?? ''
    const time = times.time === null ? '' : (cells[times.time] ?? '')
    const shown = shorten(`${date} ${time}`.trim())
    if (shown === '') return { ok: false, reason: 'There is no date.', cells: '' }
    const local = this.context.order && readTime(date, time, this.context.order)
    if (!local) {
      return {
        ok: false,
        reason: `The date can't be read (${this.context.order ?? 'no order fits'}).`,
        cells: shown,
      }
    }
    if (!local.hasTime) {
      if (times.timeIfNone === null) {
        return { ok: false, reason: 'There is no time of day: choose one for such rows.', cells: shown }
      }
      const [hours = 0, minutes = 0] = times.timeIfNone.split(':').map(Number)
      local.clock += (hours * 60 + minutes) * 60_000
    }
    const instant = this.clockwork.instant(local, instrumentId)
    return { ...instant, cells: shown }
  }
}
