/**
 * Starts MariaDB and the two stand-ins in the foreground, with throw-away settings, for developers who run single
 * tests: node scripts/services.js --data FOLDER [--ports-from 33261]
 * The variables that point the application at them are printed and written to FOLDER/environment.sh (to be
 * sourced) and FOLDER/environment.json.
 */
import { renameSync, writeFileSync } from 'node:fs'
import { dirname, join, resolve } from 'node:path'
import { fileURLToPath } from 'node:url'
import { parseArgs } from 'node:util'
import { CannotStart } from './services/cannot-start.js'
import { demoVariables, startDemoServices } from './services/demo-services.js'
import { ensureDebianPackages, ensureNodePackages, ensureNodeVersion } from './services/machine.js'
import { claimFolder } from './services/only-run.js'
import { portFrom } from './services/ports.js'
import { createProcesses } from './services/processes.js'
import { untilTold } from './services/until-told.js'

const root = dirname(dirname(fileURLToPath(import.meta.url)))
const processes = createProcesses({ root, onUnexpectedEnd: (failure) => stopNow(failure) })
const { stopNow } = untilTold(() => processes.stopAll())

try {
  const { values } = parseArgs({
    options: { data: { type: 'string' }, 'ports-from': { type: 'string', default: '33261' } },
  })
  if (!values.data)
    throw new CannotStart('Give the folder for the data: node scripts/services.js --data FOLDER')
  const from = portFrom({ '--ports-from': values['ports-from'] }, '--ports-from')
  ensureNodeVersion(root)
  ensureDebianPackages(['mariadb-server-core', 'mariadb-client-core'])
  ensureNodePackages(root)
  const folder = resolve(values.data)
  const ports = { database: from, s3: from + 1, smtp: from + 2, web: 3000 }
  const variables = demoVariables({ folder, ports, schema: 'lavant_dev' })
  processes.afterwards(claimFolder(folder))
  await startDemoServices({ processes, root, folder, ports, variables, throwAway: true })
  const lines = Object.entries(variables).map(([name, value]) => `export ${name}='${value}'`)
  publish(join(folder, 'environment.json'), JSON.stringify(variables, null, 2))
  publish(join(folder, 'environment.sh'), lines.join('\n'))
  console.log(`${lines.join('\n')}\n\nReady. Ctrl-C stops them.`)
} catch (failure) {
  await stopNow(failure)
}

function publish(file, text) {
  writeFileSync(`${file}.new`, `${text}\n`, { mode: 0o600 })
  renameSync(`${file}.new`, file)
}
