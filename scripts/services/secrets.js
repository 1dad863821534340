import { randomBytes } from 'node:crypto'
import { chmodSync, existsSync, mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { CannotStart } from './cannot-start.js'

/** Every secret that the demo makes for itself, with the number of random bytes behind its hexadecimal text. */
const sizes = {
  databasePassword: 24,
  databaseRootPassword: 24,
  s3AccessKey: 10,
  s3SecretKey: 24,
  sessionSecret: 32,
  codeSecret: 32,
}

/**
 * The secrets of a data folder: read from secrets.json, made at random where they are missing. The folder is
 * readable by its owner alone and so is the file.
 * Throws CannotStart when the file cannot be read as JSON, since new secrets would sign everybody out unasked.
 */
export function secretsIn(folder) {
  mkdirSync(folder, { recursive: true })
  chmodSync(folder, 0o700)
  const file = join(folder, 'secrets.json')
  const known = existsSync(file) ? parse(file) : {}
  const secrets = {}
  for (const [name, bytes] of Object.entries(sizes)) {
    const kept = known[name]
    secrets[name] = new RegExp(`^[0-9a-f]{${2 * bytes}}$`).test(kept)
      ? kept
      : randomBytes(bytes).toString('hex')
  }
  const written = `${file}.${process.pid}`
  writeFileSync(written, `${JSON.stringify(secrets, null, 2)}\n`, { mode: 0o600 })
  renameSync(written, file)
  return secrets
}

function parse(file) {
  try {
    return JSON.parse(readFileSync(file, 'utf8'))
  } catch (error) {
    throw new CannotStart(
      `${file} cannot be read (${error.message}).\nRepair it, or remove it to have new secrets made: everybody then signs in again.`,
    )
  }
}
