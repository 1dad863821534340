/**
 * Prints why a script did not do its work, and makes it end with a failure. A message for the person who runs it
 * is an Error thrown by our own checks, printed without its stack; LAVANT_STACK=1 shows that too.
 */
export function reportAndFail(failure: unknown): void {
  const isPlain = failure instanceof Error && !process.env.LAVANT_STACK
  console.error(isPlain ? failure.message : failure)
  process.exitCode = 1
}
