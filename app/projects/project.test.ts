import { expect, test } from 'vitest'
import { levelUnit } from './project'

test('levels are said once to be above their datum, however the project words it', () => {
  expect(levelUnit('m', 'above site datum')).toBe('m above site datum')
  expect(levelUnit('m', 'm above Ordnance Datum Newlyn')).toBe('m above Ordnance Datum Newlyn')
  expect(levelUnit('ft', 'NAVD 88')).toBe('ft above NAVD 88')
})
