/**
 * npm start, and npm run dev (--dev). Runs before anything is installed, so at first it uses nothing but Node.
 * demo: installs what is missing, starts MariaDB and the stand-ins, migrates, seeds, builds and serves.
 * production: everything comes from environment variables; nothing is started but the application.
 */
import { dirname, join, resolve } from 'node:path'
import { fileURLToPath } from 'node:url'
import { CannotStart } from './services/cannot-start.js'
import { demoVariables, startDemoServices } from './services/demo-services.js'
import { ensureDebianPackages, ensureNodePackages, ensureNodeVersion } from './services/machine.js'
import { claimFolder } from './services/only-run.js'
import { claimPort, portFrom } from './services/ports.js'
import { createProcesses } from './services/processes.js'
import { untilTold } from './services/until-told.js'

const root = dirname(dirname(fileURLToPath(import.meta.url)))
const isDevelopment = process.argv.includes('--dev')
const processes = createProcesses({ root, onUnexpectedEnd: (failure) => stopNow(failure) })
const { stopNow } = untilTold(() => processes.stopAll())

/** Variables that the demo leaves to the person; every other one would lead out of the demo. */
const free = [
  'LAVANT_HOST',
  'LAVANT_PORT',
  'LAVANT_ADDRESS',
  'LAVANT_TRUSTED_PROXIES',
  'LAVANT_MAIL_FROM',
  'LAVANT_DATABASE_NAME',
  'LAVANT_DATABASE_PORT',
  'LAVANT_SMTP_PORT',
  'LAVANT_DATA',
]

function given(name) {
  return process.env[name] !== undefined && process.env[name] !== ''
}

/** The demo's variables, with what the person chose. Throws CannotStart when that points at a service elsewhere. */
function variablesOfDemo(folder, ports) {
  const variables = demoVariables({ folder, ports, schema: process.env.LAVANT_DATABASE_NAME || 'lavant' })
  const outside = Object.keys(variables).filter(
    (name) => !free.includes(name) && given(name) && process.env[name] !== variables[name],
  )
  if (outside.length > 0) {
    throw new CannotStart(
      `The demo runs on this machine only, with services of its own. Leave out: ${outside.join(', ')}\n(or set LAVANT_MODE=production).`,
    )
  }
  for (const name of ['LAVANT_HOST', 'LAVANT_ADDRESS', 'LAVANT_TRUSTED_PROXIES', 'LAVANT_MAIL_FROM']) {
    if (given(name)) variables[name] = process.env[name]
  }
  return variables
}

/** Reads TypeScript of ours; possible once the packages are installed. */
async function source(path) {
  const { tsImport } = await import('tsx/esm/api')
  return tsImport(join(root, path), import.meta.url)
}

async function checkEnvironment(variables) {
  const { parseEnvironment } = await source('app/environment.server.ts')
  try {
    return parseEnvironment(variables)
  } catch (error) {
    throw new CannotStart(error.message)
  }
}

async function startEverything() {
  ensureNodeVersion(root)
  const mode = process.env.LAVANT_MODE || 'demo'
  if (mode !== 'demo' && mode !== 'production') {
    throw new CannotStart(`LAVANT_MODE must be demo or production, not "${mode}".`)
  }
  if (isDevelopment && mode === 'production') throw new CannotStart('npm run dev works on the demo only.')
  const isDemo = mode === 'demo'
  const ports = {
    web: portFrom(process.env, 'LAVANT_PORT', 3000),
    database: portFrom(process.env, 'LAVANT_DATABASE_PORT', 33061),
    s3: portFrom(process.env, 'LAVANT_S3_PORT', 4569),
    smtp: portFrom(process.env, 'LAVANT_SMTP_PORT', 2525),
  }
  const folder = resolve(root, process.env.LAVANT_DATA || '.data')
  const variables = isDemo ? variablesOfDemo(folder, ports) : {}
  if (isDemo) ensureDebianPackages(['mariadb-server-core', 'mariadb-client-core'])
  ensureNodePackages(root)
  const environment = {
    // The SDK is pinned to a version that works on this Node: no need to warn of later ones at every start.
    AWS_SDK_JS_NODE_VERSION_SUPPORT_WARNING_DISABLED: 'true',
    ...process.env,
    ...variables,
    NODE_ENV: isDevelopment ? 'development' : 'production',
  }
  const settings = await checkEnvironment(environment)
  if (isDemo) {
    processes.afterwards(claimFolder(folder))
    await claimPort(ports.web, 'LAVANT_PORT', 'the web server')
    await startDemoServices({ processes, root, folder, ports, variables, throwAway: false })
  }
  if (isDemo) await processes.run('Setting up the demo', 'scripts/set-up-demo.ts', environment, [folder])
  else await processes.run('Migrating the database', 'scripts/migrate.ts', environment)
  if (!isDevelopment) {
    const { isBuildCurrent } = await source('scripts/services/build-stamp.ts')
    if (!isBuildCurrent(root)) {
      console.log('Building …')
      await processes.run('Building', 'scripts/build.ts', environment)
    }
  }
  await processes.start({
    name: 'The web server',
    command: process.execPath,
    arguments: ['--import', 'tsx', isDevelopment ? 'scripts/dev.ts' : 'scripts/serve.ts'],
    environment,
    channel: true,
  })
  console.log(`\nLavant is running: ${settings.address}`)
  if (isDemo) await introduceDemo(settings.address)
  console.log('\nCtrl-C stops it.')
}

async function introduceDemo(address) {
  const { demoPeople } = await source('database/seeds/people.ts')
  const width = Math.max(...demoPeople.map(({ email }) => email.length))
  console.log(
    `\nSign in as one of the demo's people. The code comes by e-mail, to be read at ${address}/mail`,
  )
  for (const { email, name, role } of demoPeople) console.log(`  ${email.padEnd(width)}  ${role} (${name})`)
}

try {
  await startEverything()
} catch (failure) {
  await stopNow(failure)
}
