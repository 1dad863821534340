/**
 * Tells the process that started this one that it is ready, and ends it on SIGTERM or when that process is gone:
 * `close` lets the work in hand finish, for `patienceMilliseconds` at most.
 */
export function runUnderParent(close: () => unknown, patienceMilliseconds = 5_000): void {
  let closing = false
  async function end() {
    if (closing) return
    closing = true
    setTimeout(() => process.exit(0), patienceMilliseconds)
    try {
      await close()
    } catch (error) {
      console.error(error)
    }
    process.exit(0)
  }
  process.on('SIGTERM', end)
  process.on('SIGINT', end)
  process.on('disconnect', end)
  process.send?.('ready')
}
