import { afterEach, beforeEach, type MockInstance, vi } from 'vitest'

/**
 * A console.error that no test asked for is a failure of the test in which it was printed. A test that expects one
 * spies on console.error itself and restores it before it ends.
 */
let errors: MockInstance<typeof console.error>

beforeEach(() => {
  const print = console.error
  errors = vi.spyOn(console, 'error').mockImplementation((...words) => print(...words))
})

afterEach(() => {
  const printed = errors.mock.calls.map((words) => words.map(String).join(' '))
  errors.mockRestore()
  if (printed.length > 0) throw new Error(`Printed with console.error: ${printed.join('\n')}`)
})
