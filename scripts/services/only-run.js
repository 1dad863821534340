import { readFileSync, rmSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { CannotStart } from './cannot-start.js'

/** When a process was started, in clock ticks since the machine was: tells a process from a later one of its number. */
function startOf(pid) {
  try {
    const status = readFileSync(`/proc/${pid}/stat`, 'utf8')
    return status.slice(status.lastIndexOf(')') + 2).split(' ')[19]
  } catch {
    return undefined
  }
}

/**
 * Claims a data folder for this process, so that a second start never stops the services of the first.
 * What a killed run left behind counts for nothing.
 * Throws CannotStart when another process is at work in the folder.
 * @returns {() => void} gives the folder up again
 */
export function claimFolder(folder) {
  const file = join(folder, 'running.json')
  const claim = JSON.stringify({ pid: process.pid, start: startOf(process.pid) })
  try {
    writeFileSync(file, claim, { mode: 0o600, flag: 'wx' })
  } catch (error) {
    if (error.code !== 'EEXIST') throw error
    const other = readClaim(file)
    if (other && other.start !== undefined && startOf(other.pid) === other.start) {
      throw new CannotStart(
        `Lavant is already running with the data in ${folder} (process ${other.pid}).\nStop that one first, or give another folder in LAVANT_DATA.`,
      )
    }
    writeFileSync(file, claim, { mode: 0o600 })
  }
  return () => rmSync(file, { force: true })
}

function readClaim(file) {
  try {
    return JSON.parse(readFileSync(file, 'utf8'))
  } catch {
    // Cut short when its writer was killed, or just given up.
    return undefined
  }
}
