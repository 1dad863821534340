import fc from 'fast-check'
import { expect, test } from 'vitest'
import { nextPage } from './next-page'

test('After sign-in a person comes back to the page they asked for, with its search', () => {
  expect(nextPage('/projects/3/heads?run=7#cut')).toBe('/projects/3/heads?run=7#cut')
})

test.each([
  '//elsewhere.test',
  '/\\elsewhere.test',
  '/\t/elsewhere.test',
  '/.//elsewhere.test',
  '/x/..//elsewhere.test',
  'https://elsewhere.test/',
  'javascript:alert(1)',
  '/sign-out',
  '/sign-in/code?next=/x',
  '',
  undefined,
])('A link that leads elsewhere after sign-in (%j) leads home', (text) => {
  expect(nextPage(text)).toBe('/')
})

test('Whatever stands in the address bar, a browser stays on this site', () => {
  const parts = fc.constantFrom('/', '\\', '.', '..', '\t', '\n', '@', ':', 'a', '?', '#', '%2f', 'https:')
  fc.assert(
    fc.property(fc.array(parts, { maxLength: 12 }), (pieces) => {
      const target = new URL(nextPage(`/${pieces.join('')}`), 'https://lavant.example.test')
      return target.origin === 'https://lavant.example.test'
    }),
    { numRuns: 5000 },
  )
})
