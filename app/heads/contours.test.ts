import { describe, expect, test } from 'vitest'
import { signedArea, type Vertex } from '~/book/field'
import {
  automaticInterval,
  contoursOf,
  intervalFor,
  levelsBetween,
  outlineOfOutside,
  outsideCells,
} from './contours'
import type { HeadField } from './field'

function fieldOf(xEdges: number[], yEdges: number[], head: (x: number, y: number) => number): HeadField {
  const middle = (edges: number[], i: number) => ((edges[i] as number) + (edges[i + 1] as number)) / 2
  const columns = xEdges.length - 1
  const heads = Float64Array.from({ length: columns * (yEdges.length - 1) }, (_, cell) =>
    head(middle(xEdges, cell % columns), middle(yEdges, Math.floor(cell / columns))),
  )
  return { xEdges: Float64Array.from(xEdges), yEdges: Float64Array.from(yEdges), heads }
}
function even(from: number, to: number, cells: number): number[] {
  return Array.from({ length: cells + 1 }, (_, i) => from + ((to - from) * i) / cells)
}
const uneven = [0, 10, 12, 13, 20, 45, 60, 100]

describe('contours', () => {
  test('intervals are nice numbers and give eight to sixteen contours', () => {
    expect(automaticInterval(0.2, 7.2)).toBe(0.5)
    expect(automaticInterval(0.2, 9.9)).toBe(1)
    expect(automaticInterval(-3.1, 118)).toBe(10)
    expect(automaticInterval(10, 10.002)).toBeCloseTo(0.0002, 12)
    expect(automaticInterval(10, 10)).toBe(1)
    expect(intervalFor(0, 10, 0.25)).toBe(0.25)
    expect(intervalFor(0, 10, 0.001)).toBe(automaticInterval(0, 10))
  })

  test('levels are the multiples of the interval inside the range, without rounding noise', () => {
    expect(levelsBetween(0.25, 0.75, 0.1)).toEqual([0.3, 0.4, 0.5, 0.6, 0.7])
    expect(levelsBetween(-1, 1, 0.5)).toEqual([-0.5, 0, 0.5])
    expect(levelsBetween(4.01, 4.09, 1)).toEqual([])
  })

  test.each([
    ['an even grid', even(0, 100, 40), even(0, 60, 24)],
    ['an uneven grid', uneven, [0, 3, 9, 30, 42, 60]],
    ['a coarse grid', even(0, 100, 3), even(0, 60, 2)],
    ['a grid finer than the drawing', even(0, 100, 900), even(0, 60, 40)],
  ])('contours of a plane are straight, in the right place and reach both edges: %s', (_, xEdges, yEdges) => {
    // h = 20 - 0.1 x + 0.05 y, so h = 15 lies on x = 50 + 0.5 y.
    const field = fieldOf(xEdges, yEdges, (x, y) => 20 - 0.1 * x + 0.05 * y)
    const [contour] = contoursOf(field, [15])
    expect(contour?.lines).toHaveLength(1)
    const line = contour?.lines[0] as Vertex[]
    for (const [x, y] of line) expect(x).toBeCloseTo(50 + 0.5 * y, 6)
    const heights = line.map(([, y]) => y)
    expect(Math.min(...heights)).toBeCloseTo(0, 9)
    expect(Math.max(...heights)).toBeCloseTo(60, 9)
    // Higher ground lies west of it: a trapezium of 60 x (50 + 80) / 2.
    const area = contour?.area.flat().reduce((sum, ring) => sum + signedArea(ring.slice(0, -1)), 0)
    expect(Math.abs(area as number)).toBeCloseTo(3900, 6)
  })

  test('the contour round a well is a closed ring at the radius of the formula', () => {
    const field = fieldOf(even(-50, 50, 200), even(-50, 50, 200), (x, y) => Math.log(Math.hypot(x, y) + 1e-9))
    const [contour] = contoursOf(field, [Math.log(30)])
    expect(contour?.lines).toHaveLength(1)
    const ring = contour?.lines[0] as Vertex[]
    expect(ring[0]).toEqual(ring.at(-1))
    for (const [x, y] of ring) expect(Math.hypot(x, y)).toBeCloseTo(30, 1)
  })

  test('contours run up to the edge of a hole in the model, which is told apart from the model', () => {
    const edges = even(0, 10, 10)
    const field = fieldOf(edges, edges, (x) => x)
    const inHole = (i: number, j: number) => i >= 4 && i <= 6 && j >= 3 && j <= 5
    field.heads.forEach((_, cell) => {
      if (inHole(cell % 10, Math.floor(cell / 10))) field.heads[cell] = Number.NaN
    })
    const [contour] = contoursOf(field, [3.2])
    for (const [x] of contour?.lines.flat() ?? []) expect(x).toBeCloseTo(3.2, 6)
    expect(outsideCells(field)).toEqual([{ x: [4, 7], y: [3, 6] }])
    const length = outlineOfOutside(field).reduce(
      (sum, [a, b]) => sum + Math.hypot(a[0] - b[0], a[1] - b[1]),
      0,
    )
    expect(length).toBe(12)
  })

  test('a field without heads has no contours and does not hang', () => {
    const field = fieldOf([0, 1, 2], [0, 1, 2], () => Number.NaN)
    expect(contoursOf(field, [1])[0]?.lines).toEqual([])
  })

  test('a field of 512 x 512 cells is traced at nine levels within a second of computing', () => {
    const edges = even(0, 512, 512)
    const field = fieldOf(edges, edges, (x, y) => Math.sin(x / 80) * 5 + Math.cos(y / 60) * 5)
    const levels = levelsBetween(-10, 10, 2)
    // The best of three: a busy machine slows any single one.
    const times = [1, 2, 3].map(() => {
      const start = process.cpuUsage()
      expect(contoursOf(field, levels).every((contour) => contour.lines.length > 0)).toBe(true)
      return process.cpuUsage(start).user
    })
    expect(Math.min(...times)).toBeLessThan(1_000_000)
  })
})
