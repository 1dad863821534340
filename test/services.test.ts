import { type ChildProcess, spawn } from 'node:child_process'
import { once } from 'node:events'
import { existsSync, mkdtempSync, readFileSync, rmSync, statSync } from 'node:fs'
import { createServer } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, afterEach, expect, test } from 'vitest'

const root = join(import.meta.dirname, '..')
const folder = mkdtempSync(join(tmpdir(), 'lavant-services-'))
// Three ports in a row that another run of the tests will hardly have chosen.
const PORT = 34_000 + (process.pid % 1000) * 3

let running: ChildProcess | undefined
afterEach(async () => {
  if (running && running.exitCode === null && running.signalCode === null) {
    running.kill('SIGTERM')
    await once(running, 'exit')
  }
})
afterAll(() => rmSync(folder, { recursive: true }))

interface Started {
  child: ChildProcess
  /** Everything printed so far. */
  output: () => string
}

/** Starts MariaDB and the stand-ins as npm start does; resolves when they are ready or have given up. */
async function startServices(): Promise<Started> {
  const words = ['scripts/services.js', '--data', folder, '--ports-from', String(PORT)]
  const child = spawn(process.execPath, words, { cwd: root, stdio: ['ignore', 'pipe', 'pipe'] })
  let output = ''
  const settled = new Promise<void>((resolve) => {
    function take(part: Buffer) {
      output += part
      if (output.includes('Ready.')) resolve()
    }
    child.stdout.on('data', take)
    child.stderr.on('data', take)
    child.on('close', () => resolve())
  })
  await settled
  return { child, output: () => output }
}

test('A first start makes everything, a second one is refused while it runs, and it stops cleanly', async () => {
  const first = await startServices()
  running = first.child
  expect(first.output()).toContain('Initialising the database')
  expect(first.output()).toContain('Ready.')
  expect(statSync(join(folder, 'secrets.json')).mode & 0o777).toBe(0o600)
  expect(statSync(folder).mode & 0o777).toBe(0o700)

  const second = await startServices()
  expect(second.output()).toContain(`already running with the data in ${folder} (process ${first.child.pid})`)
  expect(second.child.exitCode).toBe(1)

  first.child.kill('SIGINT')
  first.child.kill('SIGINT')
  await once(first.child, 'close')
  expect(first.child.exitCode).toBe(0)
  expect(existsSync(join(folder, 'mariadb/mariadbd.pid'))).toBe(false)
  expect(existsSync(join(folder, 'running.json'))).toBe(false)
})

test('After a run that was killed the next one finds its database, and everything is there', async () => {
  const secrets = readFileSync(join(folder, 'secrets.json'), 'utf8')
  const first = await startServices()
  first.child.kill('SIGKILL')
  await once(first.child, 'exit')

  const second = await startServices()
  running = second.child
  expect(second.output()).toContain('of an earlier run that was killed is still there: stopping it')
  expect(second.output()).not.toContain('Initialising')
  expect(second.output()).toContain('Ready.')
  expect(readFileSync(join(folder, 'secrets.json'), 'utf8')).toBe(secrets)
})

test('A database folder that was only half made is made again', async () => {
  rmSync(join(folder, 'mariadb/initialised'))
  rmSync(join(folder, 'mariadb/data/lavant_dev'), { recursive: true })
  const { child, output } = await startServices()
  running = child
  expect(output()).toContain('only half made: making it again')
  expect(output()).toContain('Ready.')
})

test('A port that is taken is named together with the variable that moves it', async () => {
  const other = createServer().listen(PORT, '127.0.0.1')
  await once(other, 'listening')
  try {
    const { child, output } = await startServices()
    expect(output()).toContain(`Port ${PORT}, wanted for the database, is taken by another program.`)
    expect(output()).toContain('LAVANT_DATABASE_PORT=')
    expect(child.exitCode).toBe(1)
  } finally {
    other.close()
  }
})
