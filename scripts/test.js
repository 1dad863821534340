/**
 * npm test: brings what is missing, starts services of its own with throw-away data, and runs everything: the linters,
 * the compiler, unit and integration tests, and browser tests against the built application. Its last line says how
 * many passed and failed, a linter and the compiler counting as one each.
 *
 * For developers: npm test -- unit [FILES …] or npm test -- browser [FILES …] runs one kind only.
 */
import { existsSync, mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { CannotStart } from './services/cannot-start.js'
import { demoVariables, startDemoServices } from './services/demo-services.js'
import { ensureDebianPackages, ensureNodePackages, ensureNodeVersion } from './services/machine.js'
import { freePort } from './services/ports.js'
import { createProcesses } from './services/processes.js'
import { untilTold } from './services/until-told.js'

const MINUTE = 60_000
const root = dirname(dirname(fileURLToPath(import.meta.url)))
const tally = { passed: 0, failed: 0 }
const processes = createProcesses({ root, onUnexpectedEnd: (failure) => stopNow(failure) })
const { stopNow } = untilTold(async (failure) => {
  await processes.stopAll()
  if (failure) tally.failed++
  console.log(`${tally.passed} passed, ${tally.failed} failed`)
}, 130)

/** One step that either passes or fails as a whole. */
async function step(name, words, environment) {
  console.log(`\n${name} …`)
  const npm = process.env.npm_execpath
  const [command, ...first] = npm ? [process.execPath, npm] : ['npm']
  const ended = await processes.finish(command, [...first, ...words], environment, 10 * MINUTE)
  if (ended === 0) tally.passed++
  else {
    tally.failed++
    console.error(`${name} failed (${ended}).`)
  }
  return ended === 0
}

/** Runs Vitest and adds what it counted. Whatever it could not count, such as a file that does not load, is a failure. */
async function vitest(name, folder, words, environment) {
  console.log(`\n${name} …`)
  const results = join(folder, `${name.replaceAll(' ', '-')}.json`)
  const program = join(root, 'node_modules/vitest/vitest.mjs')
  const options = ['run', '--reporter=default', '--reporter=json', `--outputFile.json=${results}`]
  const ended = await processes.finish(
    process.execPath,
    [program, ...options, ...words],
    environment,
    40 * MINUTE,
  )
  const counted = existsSync(results) ? JSON.parse(readFileSync(results, 'utf8')) : undefined
  const passed = counted?.numPassedTests ?? 0
  const unloaded = counted?.testResults.filter(
    (file) => file.status === 'failed' && file.assertionResults.length === 0,
  )
  let failed = (counted?.numFailedTests ?? 0) + (unloaded?.length ?? 0)
  if (failed === 0 && (ended !== 0 || passed === 0)) failed = 1
  if (counted?.numPendingTests > 0) console.log(`${counted.numPendingTests} skipped.`)
  tally.passed += passed
  tally.failed += failed
  return failed === 0
}

async function testEverything(kind, files) {
  ensureNodeVersion(root)
  ensureDebianPackages(['mariadb-server-core', 'mariadb-client-core', 'chromium', 'poppler-utils'])
  ensureNodePackages(root)
  const folder = mkdtempSync(join(tmpdir(), 'lavant-test-'))
  processes.afterwards(() => rmSync(folder, { recursive: true, force: true }))
  const database = await freePort(33161)
  const s3 = await freePort(4669, [database])
  const smtp = await freePort(2625, [database, s3])
  const web = await freePort(3100, [database, s3, smtp])
  const ports = { database, s3, smtp, web }
  const variables = demoVariables({ folder, ports, schema: 'lavant_test' })
  // What somebody has set for their own Lavant must not reach the tests.
  const own = Object.entries(process.env).filter(([name]) => !/^(LAVANT_|NODE_ENV$|VITEST)/.test(name))
  const environment = {
    AWS_SDK_JS_NODE_VERSION_SUPPORT_WARNING_DISABLED: 'true',
    ...Object.fromEntries(own),
    ...variables,
  }

  if (kind === undefined) {
    await step('Linters', ['run', '--silent', 'lint'], environment)
    await step('Compiler', ['run', '--silent', 'typecheck'], environment)
  }
  await startDemoServices({ processes, root, folder, ports, variables, throwAway: true })
  if (kind !== 'browser') await vitest('Unit and integration tests', folder, files, environment)
  if (kind !== 'unit') await testInBrowser(folder, files, environment)
}

/** Builds the application, sets up its demo and serves it, as npm start does, and lets the browser tests loose on it. */
async function testInBrowser(folder, files, environment) {
  const production = { ...environment, NODE_ENV: 'production' }
  await processes.run('Setting up the demo', 'scripts/set-up-demo.ts', production, [folder])
  const { tsImport } = await import('tsx/esm/api')
  const { isBuildCurrent } = await tsImport('./services/build-stamp.ts', import.meta.url)
  if (!isBuildCurrent(root)) {
    console.log('\nBuilding …')
    await processes.run('Building', 'scripts/build.ts', production)
  }
  const log = join(folder, 'logs/web.log')
  await processes.start({
    name: 'The web server',
    command: process.execPath,
    arguments: ['--import', 'tsx', 'scripts/serve.ts'],
    environment: production,
    log,
    channel: true,
  })
  const passed = await vitest('Browser tests', folder, files, {
    ...environment,
    LAVANT_TESTS: 'browser',
    LAVANT_TEST_ADDRESS: environment.LAVANT_ADDRESS,
  })
  const printed = readFileSync(log, 'utf8').trim()
  if (!passed && printed)
    console.log(`\nThe web server printed:\n${printed.split('\n').slice(-60).join('\n')}`)
}

try {
  const [kind, ...files] = process.argv.slice(2)
  if (kind !== undefined && kind !== 'unit' && kind !== 'browser') {
    throw new CannotStart(`Unknown kind of tests: ${kind}. Use: npm test [-- unit|browser [FILES …]]`)
  }
  await testEverything(kind, files)
  await processes.stopAll()
  console.log(`\n${tally.passed} passed, ${tally.failed} failed`)
  process.exit(tally.failed === 0 && tally.passed > 0 ? 0 : 1)
} catch (failure) {
  await stopNow(failure)
}
