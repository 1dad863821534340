import { CannotStart } from './cannot-start.js'

/**
 * Runs something that lasts until it is told to stop, by Ctrl-C, by a closed terminal or by SIGTERM, and then
 * stops it once, however often it is told.
 *
 * @param {(failure?: unknown) => Promise<void>} stop
 * @param {number} [codeWhenTold] exit code after a signal
 * @returns {{ stopNow: (failure?: unknown) => Promise<void> }} `stopNow` stops it from within: a failure is reported and
 *   makes the process end with 1
 */
export function untilTold(stop, codeWhenTold = 0) {
  let stopping = false

  async function stopNow(failure) {
    if (stopping) return
    stopping = true
    if (failure) report(failure)
    else console.log('\nStopping …')
    await stop(failure)
    if (!failure) console.log('Stopped.')
    process.exit(failure ? 1 : codeWhenTold)
  }

  // A terminal or a pipe that has gone must not keep us from stopping in good order.
  for (const output of [process.stdout, process.stderr]) output.on('error', () => {})
  for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP']) process.on(signal, () => stopNow())
  // npm passes a signal on to a shell between us, which dies of it without telling: then we have a new parent.
  const parent = process.ppid
  if (process.env.npm_lifecycle_event) {
    setInterval(() => process.ppid !== parent && stopNow(), 500).unref()
  }
  return { stopNow }
}

/** Prints why something did not work: alone when the person can act on it, with its stack when it is our bug. */
export function report(failure) {
  console.error(failure instanceof CannotStart ? `\n${failure.message}\n` : failure)
}
