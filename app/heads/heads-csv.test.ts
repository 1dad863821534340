import { expect, test } from 'vitest'
import { headsCsv } from './heads-csv'

const field = {
  xEdges: Float64Array.of(0, 2, 4),
  yEdges: Float64Array.of(10, 20, 30),
  heads: Float64Array.of(1, 0.1 + 0.2, Number.NaN, 4),
}

test('heads leave cell by cell with their units, without the cells that have none', () => {
  expect(headsCsv(field, null, 'm').join('')).toBe(
    '\ufeffx (m),y (m),head (m)\r\n1,15,1\r\n3,15,0.3\r\n3,25,4\r\n',
  )
})

test('drawdown stands beside the head, and is blank where the other run has no head', () => {
  const drawdown = { ...field, heads: Float64Array.of(0.5, Number.NaN, Number.NaN, 0) }
  expect(headsCsv(field, drawdown, 'ft').join('').split('\r\n')).toEqual([
    '\ufeffx (ft),y (ft),head (ft),drawdown (ft)',
    '1,15,1,0.5',
    '3,15,0.3,',
    '3,25,4,0',
    '',
  ])
})
