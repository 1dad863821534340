import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { drawdownBetween, type HeadField, headAt, rangeOf } from './field'

function fieldOf(xEdges: number[], yEdges: number[], head: (x: number, y: number) => number): HeadField {
  const columns = xEdges.length - 1
  const rows = yEdges.length - 1
  const heads = Float64Array.from({ length: columns * rows }, (_, cell) => {
    const i = cell % columns
    const j = Math.floor(cell / columns)
    return head(
      ((xEdges[i] as number) + (xEdges[i + 1] as number)) / 2,
      ((yEdges[j] as number) + (yEdges[j + 1] as number)) / 2,
    )
  })
  return { xEdges: Float64Array.from(xEdges), yEdges: Float64Array.from(yEdges), heads }
}

const uneven = [0, 1, 3, 4, 8, 16, 17]

describe('reading a head field', () => {
  test('a plane is read exactly everywhere in the extent, on an uneven grid too, up to its edges', () => {
    const plane = (x: number, y: number) => 12 + 0.03 * x - 0.2 * y
    const field = fieldOf(uneven, [-5, -4, 0, 10], plane)
    fc.assert(
      fc.property(
        fc.double({ min: 0, max: 17, noNaN: true }),
        fc.double({ min: -5, max: 10, noNaN: true }),
        (x, y) => {
          expect(headAt(field, x, y)).toBeCloseTo(plane(x, y), 9)
        },
      ),
    )
  })

  test('there is no head outside the extent or in a cell outside the model', () => {
    const field = fieldOf(uneven, uneven, () => 3)
    field.heads[0] = Number.NaN
    expect(headAt(field, -0.01, 5)).toBeNaN()
    expect(headAt(field, 5, 17.01)).toBeNaN()
    expect(headAt(field, 0.5, 0.5)).toBeNaN()
    expect(headAt(field, 1.2, 0.5)).toBe(3)
  })

  test('a model one cell wide is read at its only cell', () => {
    expect(
      headAt(
        fieldOf([0, 10], [0, 10], () => 7),
        2,
        9,
      ),
    ).toBe(7)
  })

  test('drawdown is the head before less the head now, also between different grids', () => {
    const before = fieldOf([0, 5, 10, 20], [0, 10, 20], (x) => 10 + x)
    const now = fieldOf([0, 4, 8, 12, 20], [0, 20], (x) => 10 + x - 2.5)
    for (const value of drawdownBetween(now, before).heads) expect(value).toBeCloseTo(2.5, 9)
    for (const value of drawdownBetween(before, before).heads) expect(value).toBe(0)
  })

  test('the lowest and the highest head are found with where they are, cells without a head left out', () => {
    const field = fieldOf([0, 2, 4, 6], [0, 2], (x) => x)
    field.heads[2] = Number.NaN
    expect(rangeOf(field)).toEqual({ low: 1, high: 3, lowAt: [1, 1], highAt: [3, 1] })
    expect(rangeOf(fieldOf([0, 1], [0, 1], () => Number.NaN))).toBeNull()
  })
})
