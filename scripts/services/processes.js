import { spawn } from 'node:child_process'
import { once } from 'node:events'
import { closeSync, openSync, readFileSync } from 'node:fs'
import { CannotStart } from './cannot-start.js'

/**
 * Starts long-running processes and stops them in the reverse order.
 *
 * Each gets a session of its own, so that Ctrl-C in the terminal reaches only the process that started them and
 * the order of stopping is ours. A Node child gets a channel: it sends 'ready', and ends by itself when the
 * channel breaks, that is when we were killed.
 */
export function createProcesses({ root, onUnexpectedEnd }) {
  const running = []
  const cleanUps = []
  let stopping

  function refuseWhileStopping() {
    if (stopping) throw new CannotStart('Stopping.')
  }

  /**
   * @param {object} what
   * @param {string} what.name words for messages, such as "the database"
   * @param {string} what.command
   * @param {string[]} what.arguments
   * @param {Record<string, string | undefined>} what.environment
   * @param {string} [what.log] file that receives its output; without one it shares ours
   * @param {boolean} [what.channel] whether it is a Node child that reports 'ready'
   * @param {number} [what.patience] milliseconds that it may take to stop before it is killed
   */
  async function start(what) {
    refuseWhileStopping()
    const log = what.log ? openSync(what.log, 'a', 0o600) : undefined
    const output = log ?? 'inherit'
    const child = spawn(what.command, what.arguments, {
      cwd: root,
      env: what.environment,
      stdio: what.channel ? ['ignore', output, output, 'ipc'] : ['ignore', output, output],
      detached: true,
    })
    if (log !== undefined) closeSync(log)
    const entry = { ...what, child, ended: undefined }
    const failure = new Promise((_, reject) => {
      child.once('error', (error) => reject(new CannotStart(`${what.name} did not start: ${error.message}`)))
      child.once('exit', (code, signal) => {
        entry.ended = signal ?? code
        reject(new CannotStart(`${what.name} stopped by itself (${entry.ended}).${endOf(what.log)}`))
      })
    })
    let isReady = false
    failure.catch((error) => {
      if (isReady && !stopping) onUnexpectedEnd(error)
    })
    running.push(entry)
    if (what.channel) {
      const ready = new Promise((resolve) => {
        child.on('message', (message) => {
          if (message === 'ready') resolve(undefined)
        })
      })
      await Promise.race([ready, failure])
    } else if (what.ready) {
      await Promise.race([what.ready(() => entry.ended !== undefined), failure])
    }
    isReady = true
    return child
  }

  async function stopOne(entry) {
    if (entry.ended !== undefined || entry.child.pid === undefined) return
    const ended = new Promise((resolve) => entry.child.once('exit', resolve))
    signalGroup(entry.child, 'SIGTERM')
    const killer = setTimeout(() => signalGroup(entry.child, 'SIGKILL'), entry.patience ?? 10_000)
    await ended
    clearTimeout(killer)
  }

  /**
   * Runs a command to its end and returns its exit code, or the name of the signal that ended it.
   * @param {string} command
   * @param {string[]} words
   * @param {Record<string, string | undefined>} environment
   * @param {number} [limit] milliseconds after which it is stopped
   */
  async function finish(command, words, environment, limit) {
    refuseWhileStopping()
    const child = spawn(command, words, {
      cwd: root,
      env: environment,
      stdio: ['ignore', 'inherit', 'inherit'],
      detached: true,
    })
    const entry = { name: command, child, ended: undefined }
    running.push(entry)
    const timer = limit && setTimeout(() => stopOne(entry), limit)
    const [code, signal] = await once(child, 'exit')
    clearTimeout(timer)
    entry.ended = signal ?? code
    return entry.ended
  }

  /** Runs a TypeScript script of ours to its end. Throws CannotStart when it fails, having said why itself. */
  async function run(name, script, environment, words = []) {
    const ended = await finish(process.execPath, ['--import', 'tsx', script, ...words], environment)
    if (ended !== 0) throw new CannotStart(`${name} failed (${ended}); see above.`)
  }

  /** Enters what is to be tidied away once every process has stopped. */
  function afterwards(cleanUp) {
    cleanUps.push(cleanUp)
  }

  /** Stops everything, last started first. Calling it again waits for the same stop. */
  function stopAll() {
    stopping ??= (async () => {
      for (const entry of running.toReversed()) await stopOne(entry)
      for (const cleanUp of cleanUps.toReversed()) cleanUp()
    })()
    return stopping
  }

  return { start, finish, run, afterwards, stopAll }
}

/** Each child leads a group of its own, so that what it started in turn is reached as well. */
function signalGroup(child, signal) {
  try {
    process.kill(-child.pid, signal)
  } catch (error) {
    // Gone already: its exit is about to be reported.
    if (error.code !== 'ESRCH') throw error
  }
}

function endOf(log) {
  if (!log) return ''
  const lines = readFileSync(log, 'utf8').trim().split('\n').slice(-12)
  return ` The end of ${log}:\n${lines.map((line) => `  ${line}`).join('\n')}`
}
