import { IANAZone } from 'luxon'
import { describe, expect, test } from 'vitest'
import { Clockwork, clockText, instantsOf, provenOrder, readTime, TimeWitness } from './read-time'
import type { DateOrder } from './time-rules'

const now = new Date('2026-12-01T00:00:00Z')

function clock(date: string, time: string, order: DateOrder): string | null {
  const read = readTime(date, time, order)
  return read && new Date(read.clock).toISOString()
}

describe('A date is read in the order that was chosen', () => {
  test.each([
    ['2026-03-14 09:30', '', 'year first', '2026-03-14T09:30:00.000Z'],
    ['2026-03-14T09:30:15.250', '', 'year first', '2026-03-14T09:30:15.250Z'],
    ['20260314', '0930', 'year first', '2026-03-14T09:30:00.000Z'],
    ['14/03/2026', '9:30:05', 'day first', '2026-03-14T09:30:05.000Z'],
    ['14.03.26 09:30', '', 'day first', '2026-03-14T09:30:00.000Z'],
    ['14 Mar 2026 9:30 pm', '', 'day first', '2026-03-14T21:30:00.000Z'],
    ['Mar 14, 2026 12:05 AM', '', 'month first', '2026-03-14T00:05:00.000Z'],
    ['3/14/2026', '24:00', 'month first', '2026-03-15T00:00:00.000Z'],
    ['2026-03-14 00:00:00', '09:30', 'year first', '2026-03-14T09:30:00.000Z'],
    ['46095.5', '', 'serial 1900', '2026-03-14T12:00:00.000Z'],
    ['44633', '0.25', 'serial 1904', '2026-03-14T06:00:00.000Z'],
  ] as const)('%s %s, %s', (date, time, order, expected) => {
    expect(clock(date, time, order)).toBe(expected)
  })

  test.each([
    ['30/02/2026', '', 'day first'],
    ['14/03/2026', '', 'month first'],
    ['2026-03-14', '25:00', 'year first'],
    ['2026-03-14', '24:01', 'year first'],
    ['14 Mar 2026', '', 'month first'],
    ['yesterday', '', 'day first'],
    ['12.5', '', 'serial 1900'],
  ] as const)('%s %s is no date, %s', (date, time, order) => {
    expect(clock(date, time, order)).toBeNull()
  })
})

test('A whole file proves its order: one day above the twelfth is enough', () => {
  const witness = new TimeWitness(now)
  for (const date of ['01/02/2026', '02/02/2026', '13/02/2026']) witness.weigh(date, '', '')
  expect(provenOrder(witness.proof())).toBe('day first')
})

test('A file whose days all stay below the thirteenth proves nothing, but shows which order runs backwards', () => {
  const witness = new TimeWitness(now)
  for (const date of ['01/02/2026', '02/02/2026', '01/03/2026', '02/03/2026']) witness.weigh(date, '', '')
  const proof = witness.proof()
  expect(provenOrder(proof)).toBeNull()
  expect(proof.tallies.map(({ order, backwards }) => [order, backwards])).toEqual([
    ['day first', 0],
    ['month first', 1],
  ])
})

test('An order that puts readings into the future does not fit them', () => {
  const witness = new TimeWitness(new Date('2026-03-20T00:00:00Z'))
  for (const date of ['05/03/2026', '06/03/2026']) witness.weigh(date, '', '')
  expect(provenOrder(witness.proof())).toBe('day first')
})

describe('Clock changes', () => {
  const london = IANAZone.create('Europe/London')

  test('The hour that the clocks skip has no instant, the hour they repeat has two', () => {
    expect(instantsOf(Date.UTC(2026, 2, 29, 1, 30), london)).toEqual([])
    expect(instantsOf(Date.UTC(2026, 9, 25, 1, 30), london).map((at) => new Date(at).toISOString())).toEqual([
      '2026-10-25T00:30:00.000Z',
      '2026-10-25T01:30:00.000Z',
    ])
    expect(instantsOf(Date.UTC(2026, 6, 1, 12), london)).toEqual([Date.UTC(2026, 6, 1, 11)])
  })

  test.each([
    ['Europe/London', Date.UTC(2025, 2, 28), Date.UTC(2025, 2, 31)],
    ['Europe/London', Date.UTC(2025, 9, 24), Date.UTC(2025, 9, 28)],
    ['America/Chicago', Date.UTC(2025, 10, 1), Date.UTC(2025, 10, 4)],
    ['Australia/Lord_Howe', Date.UTC(2025, 3, 4), Date.UTC(2025, 3, 7)],
    ['Asia/Kolkata', Date.UTC(2025, 5, 1), Date.UTC(2025, 5, 2)],
  ] as const)(
    'Read in order, every half hour in %s is the instant at which its clocks show it',
    (name, from, to) => {
      const zone = IANAZone.create(name)
      const clockwork = new Clockwork({ rule: 'site', repeated: 'in order' }, name)
      for (let at = from; at < to; at += 1_800_000) {
        const shown = at + zone.offset(at) * 60_000
        const read = clockwork.instant({ clock: shown, hasTime: true, offset: null }, 'A')
        expect(read).toEqual({ ok: true, at })
      }
    },
  )

  test('A missing hour is refused; a repeated one is refused until somebody says which it is', () => {
    const skipped = { clock: Date.UTC(2026, 2, 29, 1, 30), hasTime: true, offset: null }
    const twice = { clock: Date.UTC(2026, 9, 25, 1, 30), hasTime: true, offset: null }
    const refusing = new Clockwork({ rule: 'site', repeated: 'refuse' }, 'Europe/London')
    expect(refusing.instant(skipped, '')).toMatchObject({
      ok: false,
      reason: expect.stringContaining('skipped'),
    })
    expect(refusing.instant(twice, '')).toMatchObject({ ok: false, reason: expect.stringContaining('twice') })
    const second = new Clockwork({ rule: 'site', repeated: 'second' }, 'Europe/London')
    expect(second.instant(twice, '')).toEqual({ ok: true, at: Date.UTC(2026, 9, 25, 1, 30) })
  })
})

test('A written offset counts only under the rule that takes it', () => {
  const local = readTime('2026-03-14T09:30:00+02:00', '', 'year first')
  if (!local) throw new Error('unread')
  expect(new Clockwork({ rule: 'written' }, 'UTC').instant(local, '')).toEqual({
    ok: true,
    at: Date.UTC(2026, 2, 14, 7, 30),
  })
  expect(new Clockwork({ rule: 'utc' }, 'UTC').instant(local, '').ok).toBe(false)
  expect(clockText(local.clock)).toBe('14 Mar 2026 09:30')
})
