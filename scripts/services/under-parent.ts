/**
 * Tells the process that started this one that it is ready, and ends it on SIGTERM or when that process is gone:
 * `close` lets go of what keeps the event loop alive; what is still open a few seconds later is cut.
 */
export function runUnderParent(close: () => unknown, patienceMilliseconds = 5_000): void {
  let closing = false
  function end() {
    if (closing) return
    closing = true
    setTimeout(() => process.exit(0), patienceMilliseconds).unref()
    if (process.connected) process.disconnect()
    close()
  }
  process.on('SIGTERM', end)
  process.on('SIGINT', end)
  process.on('disconnect', end)
  process.send?.('ready')
}
