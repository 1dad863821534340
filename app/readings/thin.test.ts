import { expect, test } from 'vitest'
import { gaps, type SeriesPoint, thin } from './thin'

test('Thinning keeps every peak and trough, and the first and last reading', () => {
  const points: SeriesPoint[] = Array.from({ length: 20_000 }, (_, i) => [i * 1000, Math.sin(i / 300)])
  points[7777] = [7_777_000, 9]
  points[15_001] = [15_001_000, -9]
  const thinned = thin(points, 400)
  expect(thinned.length).toBeLessThanOrEqual(400)
  expect(thinned).toContainEqual([7_777_000, 9])
  expect(thinned).toContainEqual([15_001_000, -9])
  expect(thinned[0]).toEqual(points[0])
  expect(thinned.at(-1)).toEqual(points.at(-1))
  expect(thinned.every((point, i) => i === 0 || point[0] > (thinned[i - 1] as SeriesPoint)[0])).toBe(true)
})

test('A short series stays as it is', () => {
  expect(thin([[0, 1]], 4)).toEqual([[0, 1]])
  expect(thin([], 4)).toEqual([])
})

test('The line breaks where readings are missing, not where they are only a little late', () => {
  const points: SeriesPoint[] = [0, 1, 2, 3, 5, 30, 31].map((hour) => [hour * 3_600_000, 0])
  expect(gaps(points)).toEqual([5 * 3_600_000])
})
