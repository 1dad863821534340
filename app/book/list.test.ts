import { expect, test } from 'vitest'
import { polygon, polyline } from './field'
import { mostNamed } from './list'

function problems(answer: ReturnType<typeof polyline.safeParse>) {
  return answer.error?.issues.map(({ path, message }) => `${path.join('.')}: ${message}`) ?? []
}

test('A line is read as it was drawn', () => {
  const drawn = [
    [0, 0],
    [10.5, -3],
  ]
  expect(polyline.parse(drawn)).toEqual(drawn)
})

test('A line of one vertex is refused in words, and a wrong vertex is named with its place', () => {
  expect(problems(polyline.safeParse([[0, 0]]))).toEqual([': A line needs two vertices at least.'])
  expect(
    problems(
      polyline.safeParse([
        [0, 0],
        [1, 'a'],
      ]),
    ),
  ).toEqual(['1.1: A coordinate is needed.'])
})

test('However much is sent as a line or a polygon, reading it takes no time worth mentioning', () => {
  const begun = performance.now()
  expect(problems(polyline.safeParse(Array(2000).fill(0)))).toHaveLength(mostNamed)
  expect(problems(polyline.safeParse(Array(500_000).fill(0)))).toHaveLength(1)
  const round = Array.from({ length: 200_000 }, (_, k) => [Math.cos(k / 40_000), Math.sin(k / 40_000)])
  expect(problems(polygon.safeParse(round))).toHaveLength(1)
  expect(performance.now() - begun).toBeLessThan(2000)
})
