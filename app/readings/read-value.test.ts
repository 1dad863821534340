import { describe, expect, test } from 'vitest'
import { noDecimalProof, provenDecimal, readNumber, readValue, weighDecimal } from './read-value'

describe('Numbers under a decimal mark', () => {
  test.each([
    ['12.5', 'point', 12.5],
    ['-0.25', 'point', -0.25],
    ['−3', 'point', -3],
    ['1,234.5', 'point', 1234.5],
    ["1'234.5", 'point', 1234.5],
    ['1 234,5', 'comma', 1234.5],
    ['1.234,5', 'comma', 1234.5],
    ['.5', 'point', 0.5],
    ['1e-3', 'point', 0.001],
    ['12,5', 'point', null],
    ['12.5', 'comma', null],
    ['12.5.1', 'point', null],
    ['.', 'point', null],
    ['', 'point', null],
  ] as const)('%s, %s', (text, mark, value) => {
    expect(readNumber(text, mark)).toBe(value)
  })
})

function proven(values: string[]) {
  const proof = noDecimalProof()
  for (const value of values) weighDecimal(proof, value)
  return provenDecimal(proof)
}

test('The decimal mark is proven over the file; "1,234" alone is a question', () => {
  expect(proven(['12.5', '13'])).toBe('point')
  expect(proven(['12,5', '1.234,5'])).toBe('comma')
  expect(proven(['12.345', '11.987'])).toBe('point')
  expect(proven(['1,234', '2,345'])).toBeNull()
  expect(proven(['12', '13'])).toBe('point')
})

test('A value is converted once, exactly, from the number entered', () => {
  expect(readValue('12.5', 'point', 'm')).toEqual({ ok: true, value: 12.5, operator: null, status: null })
  expect(readValue('10 ft', 'point', 'ft')).toMatchObject({ ok: true, value: 10 * 0.3048 })
  expect(readValue('9.80665', 'point', 'kPa')).toMatchObject({ ok: true, value: expect.closeTo(1, 12) })
})

test('Bounds keep their operator and status words are never numbers', () => {
  expect(readValue('>25.3', 'point', 'm')).toMatchObject({ ok: true, value: 25.3, operator: '>' })
  expect(readValue('DRY', 'point', 'm')).toEqual({ ok: true, value: null, operator: null, status: 'dry' })
  expect(readValue('no access', 'point', 'm')).toMatchObject({ status: 'not accessed' })
})

test.each([
  ['', 'There is no value.'],
  ['abc', '"abc" is neither a number nor a status.'],
  ['12.5 ft', '"12.5 ft" is in ft, but the column was chosen as m.'],
  ['-9999', '-9999 is a usual mark for a missing reading, not a measurement.'],
  ['45000', '45000 m is beyond any level on Earth: check the unit.'],
])('"%s" is refused with its reason', (text, reason) => {
  expect(readValue(text, 'point', 'm')).toEqual({ ok: false, reason })
})
