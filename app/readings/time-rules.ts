export const dateOrders = ['year first', 'day first', 'month first', 'serial 1900', 'serial 1904'] as const
export type DateOrder = (typeof dateOrders)[number]

export const dateOrderWords: Record<DateOrder, string> = {
  'year first': 'year first: 2026-03-14',
  'day first': 'day first: 14/03/2026',
  'month first': 'month first: 03/14/2026',
  'serial 1900': 'spreadsheet day number, counted from 1900',
  'serial 1904': 'spreadsheet day number, counted from 1904',
}

export type RepeatedHour = 'refuse' | 'first' | 'second' | 'in order'

export type ZoneRule =
  | { rule: 'utc' }
  /** Minutes east of UTC, all the year. */
  | { rule: 'offset'; minutes: number }
  /** The site's own clock, with its changes. */
  | { rule: 'site'; repeated: RepeatedHour }
  /** Each time carries its own offset. */
  | { rule: 'written' }
