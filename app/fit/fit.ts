import { convert } from '~/units'

/** One instrument held against a run. Heads and residual in metres; null with the reason. */
export interface FitLine {
  instrumentId: string
  name: string
  x: number
  y: number
  measured: number | null
  /** First and last instant of the readings behind `measured`. */
  firstAt: string | null
  lastAt: string | null
  /** How many readings. */
  n: number
  modelled: number | null
  /** measured - modelled */
  residual: number | null
  why: string | null
}

/** What a comparison was asked of: a day (the nearest reading) or a window (the mean). */
export type FitSpan = { date: string } | { from: string; to: string }

/** Readings further than this from a date are not compared with it. */
export const nearestWithinDays = 14

/** Whether a text is a day of the calendar; 30 February, which Date would read as 2 March, is none. */
function real(day: string): boolean {
  if (!/^\d{4}-\d{2}-\d{2}$/.test(day)) return false
  const instant = new Date(`${day}T00:00:00Z`)
  return !Number.isNaN(instant.getTime()) && instant.toISOString().startsWith(day)
}

/**
 * Reads the span of a comparison from the page's address. A window needs both ends in order; anything else is a
 * message. Without any date, null: the page then takes the day of the last reading.
 */
export function spanFrom(search: URLSearchParams): { span: FitSpan | null; problem: string | null } {
  const date = search.get('date') ?? ''
  const from = search.get('from') ?? ''
  const to = search.get('to') ?? ''
  if (from !== '' || to !== '') {
    if (!real(from) || !real(to)) return { span: null, problem: 'A window needs its first and its last day.' }
    if (from > to) return { span: null, problem: 'The window ends before it begins.' }
    return { span: { from, to }, problem: null }
  }
  if (date === '') return { span: null, problem: null }
  return real(date) ? { span: { date }, problem: null } : { span: null, problem: `"${date}" is not a date.` }
}

/** Metres in the project's unit, null kept. */
export function inProjectUnit(metres: number | null, unit: 'm' | 'ft'): number | null {
  return metres === null ? null : convert({ value: metres, unit: 'm' }, unit)
}
