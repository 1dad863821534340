import { afterEach, beforeEach, expect, type MockInstance, vi } from 'vitest'

// A test may take the place of this spy with one of its own when the error is what it is about.
let errors: MockInstance<typeof console.error>

beforeEach(() => {
  errors = vi.spyOn(console, 'error')
})

afterEach(() => {
  const calls = errors.mock.calls.map((call) => call.map(String).join(' '))
  vi.restoreAllMocks()
  expect(calls, 'an error was logged during the test').toEqual([])
})
