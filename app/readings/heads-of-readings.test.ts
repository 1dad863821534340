import { expect, test } from 'vitest'
import { type DatedLevel, headOf, levelHistory, levelInForce } from './heads-of-readings'

const history = levelHistory([
  { from: '2026-03-01T00:00:00Z', level: { value: 101.9, unit: 'm' }, levelled: 'pipe top' },
  { from: '2026-01-01T00:00:00Z', level: { value: 102.3, unit: 'm' }, levelled: 'pipe top' },
  { from: '2026-01-01T00:00:00Z', level: { value: 295, unit: 'ft' }, levelled: 'sensor' },
] satisfies DatedLevel[])

const at = (text: string) => Date.parse(text)
const plain = { operator: null, status: null }

test('A dip hangs from the reference level in force when it was read: a cut casing changes later heads only', () => {
  const dip = { quantity: 'dip', value: 4, ...plain } as const
  expect(headOf({ ...dip, at: at('2026-02-28T23:59:59Z') }, history).head).toBeCloseTo(98.3, 12)
  expect(headOf({ ...dip, at: at('2026-03-01T00:00:00Z') }, history).head).toBeCloseTo(97.9, 12)
  expect(headOf({ ...dip, at: at('2025-12-31T00:00:00Z') }, history)).toEqual({
    head: null,
    why: 'no reference level in force',
  })
  expect(levelInForce(history, 'dip', at('2026-05-01T00:00:00Z'))?.level.value).toBe(101.9)
})

test('A pressure head stands on the sensor, a level stands as it is', () => {
  const pressure = {
    quantity: 'pressure head',
    value: 7.5,
    at: at('2026-04-01T00:00:00Z'),
    ...plain,
  } as const
  expect(headOf(pressure, history).head).toBeCloseTo(295 * 0.3048 + 7.5, 12)
  expect(headOf({ ...pressure, quantity: 'level' }, history).head).toBe(7.5)
})

test('Dry, or known only as a bound, is no head; a pumped or estimated number still is one', () => {
  const reading = { quantity: 'level', value: 7.5, at: at('2026-04-01T00:00:00Z'), ...plain } as const
  expect(headOf({ ...reading, value: null, status: 'dry' }, history)).toEqual({ head: null, why: 'dry' })
  expect(headOf({ ...reading, operator: '<' }, history)).toEqual({ head: null, why: 'only a bound' })
  expect(headOf({ ...reading, status: 'estimated' }, history).head).toBe(7.5)
})
