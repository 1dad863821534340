import { IANAZone } from 'luxon'
import { type DateOrder, dateOrders, type RepeatedHour, type ZoneRule } from './time-rules'

const minute = 60_000
const dayLength = 86_400_000

/** A date and time as a clock on some wall shows it, before anything is known of the zone. */
export interface LocalTime {
  /** The clock's reading as if it stood in UTC, in milliseconds. */
  clock: number
  /** False when the text has a date only; the clock then stands at midnight. */
  hasTime: boolean
  /** Minutes east of UTC, where the text says so itself. */
  offset: number | null
}

interface Groups {
  parts: [string, string, string]
  /** Position of a month written as a word. */
  named: 0 | 1 | null
  month: number
  time: number | null
  offset: number | null
}

const monthNames = ['jan', 'feb', 'mar', 'apr', 'may', 'jun', 'jul', 'aug', 'sep', 'oct', 'nov', 'dec']
const dateShape =
  /^(?:[A-Za-z]{2,9},?\s+)?(\d{1,4}|[A-Za-z]{3,9})[-/. ]\s*(\d{1,2}|[A-Za-z]{3,9})[-/., ]\s*(\d{1,4})\.?(?:(?:[T,]|\s)\s*(\S.*))?$/
const compactShape = /^(\d{4})(\d{2})(\d{2})(?:[T ]?(\d{4}|\d{6}|\d{1,2}:.*))?$/
const timeShape =
  /^(\d{1,2})(?::?(\d{2}))(?::?(\d{2})(?:[.,](\d{1,9}))?)?\s*([ap]\.?m\.?)?\s*(Z|UTC|GMT|[+-]\d{2}:?\d{2}|[+-]\d{2})?$/i
const numberShape = /^\d{1,6}(?:[.,]\d+)?$/

function readClock(text: string): { time: number; offset: number | null } | null {
  const match = text.trim().match(timeShape)
  if (!match) return null
  let hour = Number(match[1])
  const minute = Number(match[2])
  const second = Number(match[3] ?? 0)
  const milliseconds = match[4] ? Math.round(Number(`0.${match[4]}`) * 1000) : 0
  const half = match[5]?.[0]?.toLowerCase()
  if (half) {
    if (hour < 1 || hour > 12) return null
    hour = (hour % 12) + (half === 'p' ? 12 : 0)
  }
  if (minute > 59 || second > 59 || hour > 24 || (hour === 24 && minute + second + milliseconds > 0))
    return null
  return { time: ((hour * 60 + minute) * 60 + second) * 1000 + milliseconds, offset: readOffset(match[6]) }
}

function readOffset(text: string | undefined): number | null {
  if (!text) return null
  const match = text.match(/^([+-])(\d{2}):?(\d{2})?$/)
  if (!match) return 0
  return (match[1] === '-' ? -1 : 1) * (Number(match[2]) * 60 + Number(match[3] ?? 0))
}

function split(dateText: string, timeText: string): Groups | null {
  const text = dateText.trim()
  const match = text.match(compactShape) ?? text.match(dateShape)
  if (!match) return null
  const [, a = '', b = '', c = '', clockText] = match
  const parts: [string, string, string] = [a, b, c]
  let named: Groups['named'] = null
  let month = 0
  for (const place of [0, 1] as const) {
    if (!/^[A-Za-z]/.test(parts[place])) continue
    if (named !== null) return null
    named = place
    month = monthNames.indexOf(parts[place].slice(0, 3).toLowerCase()) + 1
    if (month === 0) return null
  }
  // A spreadsheet writes "00:00:00" behind the date of a date column: the time column knows better.
  const clock = timeText.trim() === '' ? clockText : timeText
  if (clock === undefined) return { parts, named, month, time: null, offset: null }
  const read = readClock(clock)
  return read && { parts, named, month, time: read.time, offset: read.offset }
}

function fullYear(text: string): number | null {
  if (text.length === 4) return Number(text)
  if (text.length !== 2) return null
  const year = Number(text)
  return year < 70 ? 2000 + year : 1900 + year
}

function arrange(groups: Groups, order: DateOrder): LocalTime | null {
  const [a, b, c] = groups.parts
  const places =
    order === 'year first'
      ? ([a, b, c] as const)
      : order === 'day first'
        ? ([c, b, a] as const)
        : ([c, a, b] as const)
  const monthPlace = order === 'month first' ? 0 : 1
  if (groups.named !== null && groups.named !== monthPlace) return null
  const year = fullYear(places[0])
  const month = groups.named === null ? Number(places[1]) : groups.month
  const day = Number(places[2])
  if (year === null || places[2].length > 2 || month < 1 || month > 12 || day < 1) return null
  if (groups.named === null && places[1].length > 2) return null
  const midnight = Date.UTC(year, month - 1, day)
  if (new Date(midnight).getUTCDate() !== day) return null
  return { clock: midnight + (groups.time ?? 0), hasTime: groups.time !== null, offset: groups.offset }
}

/** Day 0 of a spreadsheet's calendar as its later days count it (1900 was no leap year, spreadsheets say it was). */
const serialStart = { 'serial 1900': Date.UTC(1899, 11, 30), 'serial 1904': Date.UTC(1904, 0, 1) }

function readSerial(
  dateText: string,
  timeText: string,
  order: 'serial 1900' | 'serial 1904',
): LocalTime | null {
  const text = dateText.trim()
  if (!numberShape.test(text)) return null
  const day = Number(text.replace(',', '.'))
  // From 1950 to 2100: outside of it a small whole number is far more likely something else.
  if (day < 16_800 || day > 73_500) return null
  let time = 0
  let hasTime = !Number.isInteger(day)
  if (timeText.trim() !== '') {
    const fraction = /^0?[.,]\d+$/.test(timeText.trim()) ? Number(timeText.trim().replace(',', '.')) : null
    const clock = fraction === null ? readClock(timeText)?.time : fraction * 86_400_000
    if (clock === undefined) return null
    time = clock
    hasTime = true
  }
  // A day number carries rounding of its own: to the nearest second.
  const clock = serialStart[order] + Math.round((day * 86_400_000 + time) / 1000) * 1000
  return { clock, hasTime, offset: null }
}

/**
 * The clock time that a text gives under one order of the date; null when it can't be read so.
 * `timeText` is the cell of a time column, '' where there is none.
 */
export function readTime(dateText: string, timeText: string, order: DateOrder): LocalTime | null {
  if (order === 'serial 1900' || order === 'serial 1904') return readSerial(dateText, timeText, order)
  const groups = split(dateText, timeText)
  return groups && arrange(groups, order)
}

/** How one order of the date fares over a whole file. */
export interface OrderTally {
  order: DateOrder
  /** Rows that can be read so. */
  fits: number
  /** How often the time steps back from a row to the next one of the same instrument. */
  backwards: number
  first: number | null
  last: number | null
}

export interface TimeProof {
  /** Rows with something in the date cell. */
  rows: number
  /** Rows whose text carries its own offset from UTC. */
  withOffset: number
  /** Rows with a date and no time of day. */
  dateOnly: number
  tallies: OrderTally[]
}

/**
 * Tries every order on every row of a file. Feed it with `weigh`, then ask `proof`.
 * An order that puts a row beyond tomorrow does not fit it: nobody has read an instrument then.
 */
export class TimeWitness {
  private rows = 0
  private withOffset = 0
  private dateOnly = 0
  private readonly tallies: OrderTally[] = dateOrders.map((order) => ({
    order,
    fits: 0,
    backwards: 0,
    first: null,
    last: null,
  }))
  private readonly previous = dateOrders.map(() => new Map<string, number>())
  private readonly latest: number

  constructor(now: Date) {
    this.latest = now.getTime() + dayLength
  }

  weigh(dateText: string, timeText: string, instrument: string): void {
    if (dateText.trim() === '') return
    this.rows++
    const groups = split(dateText, timeText)
    let counted = false
    for (const [index, tally] of this.tallies.entries()) {
      const { order } = tally
      const read =
        order === 'serial 1900' || order === 'serial 1904'
          ? groups
            ? null
            : readSerial(dateText, timeText, order)
          : groups && arrange(groups, order)
      if (!read || read.clock > this.latest) continue
      tally.fits++
      if (!counted) {
        counted = true
        if (read.offset !== null) this.withOffset++
        if (!read.hasTime) this.dateOnly++
      }
      const before = this.previous[index]?.get(instrument)
      if (before !== undefined && read.clock < before) tally.backwards++
      this.previous[index]?.set(instrument, read.clock)
      if (tally.first === null || read.clock < tally.first) tally.first = read.clock
      if (tally.last === null || read.clock > tally.last) tally.last = read.clock
    }
  }

  proof(): TimeProof {
    const { rows, withOffset, dateOnly } = this
    return { rows, withOffset, dateOnly, tallies: this.tallies.filter((tally) => tally.fits > 0) }
  }
}

/** The order that reads more rows of the file than any other one does; null when two do equally well, or none does. */
export function provenOrder(proof: TimeProof): DateOrder | null {
  const best = Math.max(0, ...proof.tallies.map((tally) => tally.fits))
  const fitting = proof.tallies.filter((tally) => tally.fits === best)
  return best > 0 && fitting.length === 1 ? (fitting[0]?.order ?? null) : null
}

export type Instant = { ok: true; at: number } | { ok: false; reason: string }

/** The instants at which a clock in a zone shows a time: none in a missing hour, two in a repeated one. */
export function instantsOf(clock: number, zone: IANAZone): number[] {
  const offsets = new Set([zone.offset(clock - dayLength), zone.offset(clock + dayLength)])
  return [...offsets]
    .map((offset) => clock - offset * minute)
    .filter((at) => clock - zone.offset(at) * minute === at)
    .sort((a, b) => a - b)
}

/** Turns clock times into instants under a rule, remembering how far each instrument's readings have come. */
export class Clockwork {
  private readonly zone: IANAZone
  private readonly steady = new Map<number, number | null>()
  private readonly reached = new Map<string, number>()

  constructor(
    private readonly rule: ZoneRule,
    siteZone: string,
  ) {
    this.zone = IANAZone.create(siteZone)
    if (!this.zone.isValid) throw new Error(`${siteZone} is no time zone.`)
  }

  /** The offset of a whole day without a change of clocks on it or beside it; null near a change. */
  private steadyOffset(clock: number): number | null {
    const day = Math.floor(clock / dayLength)
    const known = this.steady.get(day)
    if (known !== undefined) return known
    const before = this.zone.offset((day - 1) * dayLength)
    const steady = before === this.zone.offset((day + 2) * dayLength) ? before : null
    this.steady.set(day, steady)
    return steady
  }

  instant(local: LocalTime, instrument: string): Instant {
    if (local.offset !== null) {
      return this.rule.rule === 'written'
        ? { ok: true, at: local.clock - local.offset * minute }
        : { ok: false, reason: 'The time carries its own offset from UTC: choose "as written in the file".' }
    }
    switch (this.rule.rule) {
      case 'written':
        return { ok: false, reason: 'The time carries no offset from UTC.' }
      case 'utc':
        return { ok: true, at: local.clock }
      case 'offset':
        return { ok: true, at: local.clock - this.rule.minutes * minute }
      case 'site':
        return this.onSite(local.clock, instrument, this.rule.repeated)
    }
  }

  private onSite(clock: number, instrument: string, repeated: RepeatedHour): Instant {
    const steady = this.steadyOffset(clock)
    const found = steady === null ? instantsOf(clock, this.zone) : [clock - steady * minute]
    const [first, second] = found
    if (first === undefined) {
      return {
        ok: false,
        reason: `${clockText(clock)} did not happen: the clocks of ${this.zone.name} skipped it.`,
      }
    }
    let at = first
    if (second !== undefined) {
      if (repeated === 'refuse') {
        return {
          ok: false,
          reason: `${clockText(clock)} happened twice, when the clocks of ${this.zone.name} went back: choose which.`,
        }
      }
      const before = this.reached.get(instrument)
      if (repeated === 'second' || (repeated === 'in order' && before !== undefined && first <= before))
        at = second
    }
    this.reached.set(instrument, at)
    return { ok: true, at }
  }
}

/** "26 Oct 2025 01:30", of a clock read as if it stood in UTC. */
export function clockText(clock: number): string {
  const at = new Date(clock)
  const month = monthNames[at.getUTCMonth()] ?? ''
  const two = (n: number) => String(n).padStart(2, '0')
  return `${at.getUTCDate()} ${month[0]?.toUpperCase()}${month.slice(1)} ${at.getUTCFullYear()} ${two(at.getUTCHours())}:${two(at.getUTCMinutes())}`
}
