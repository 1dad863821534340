import { execFile, spawn } from 'node:child_process'
import {
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  writeFileSync,
} from 'node:fs'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { setTimeout as pause } from 'node:timers/promises'
import { CannotStart } from './cannot-start.js'
import { claimPort } from './ports.js'

const SERVER = '/usr/sbin/mariadbd'
const INITIALISE = '/usr/bin/mariadb-install-db'
const CLIENT = '/usr/bin/mariadb'

/** As root there is no `mysql` account to change to: only the server's core package is installed. */
function userOption() {
  return process.getuid() === 0 ? ['--user=root'] : []
}

function run(command, options) {
  return new Promise((resolve, reject) => {
    execFile(command, options, { encoding: 'utf8' }, (error, stdout, stderr) => {
      if (error) reject(new CannotStart(`${command} failed:\n${stdout}${stderr}`.trim()))
      else resolve(stdout)
    })
  })
}

/** Command line of a process; empty for one that ended while we looked, or that is hidden from us. */
function wordsOf(pid) {
  try {
    return readFileSync(`/proc/${pid}/cmdline`, 'utf8').split('\0')
  } catch {
    return []
  }
}

/** Servers of an earlier run that still hold this data folder, each with the path of its socket. */
function serversOf(data) {
  return readdirSync('/proc')
    .filter((entry) => /^\d+$/.test(entry))
    .map((pid) => ({ pid: Number(pid), words: wordsOf(pid) }))
    .filter(({ words }) => words[0] === SERVER && words.includes(`--datadir=${data}`))
    .map(({ pid, words }) => ({ pid, socket: words.find((word) => word.startsWith('--socket='))?.slice(9) }))
}

function isAlive(pid) {
  try {
    // A killed process that its parent has not yet collected no longer holds anything.
    return !/^\d+ \(.*\) [ZX]/.test(readFileSync(`/proc/${pid}/stat`, 'utf8'))
  } catch {
    return false
  }
}

/** Lets a server that outlived its killed parent shut down in its own good order. */
async function stopLeftovers(data) {
  for (const { pid, socket } of serversOf(data)) {
    console.log('A database of an earlier run that was killed is still there: stopping it …')
    process.kill(pid, 'SIGTERM')
    for (let waited = 0; isAlive(pid); waited += 100) {
      if (waited > 60_000)
        throw new CannotStart(`The database of an earlier run (process ${pid}) does not stop.`)
      await pause(100)
    }
    if (/\/lavant-\w{6}\/mariadb\.sock$/.test(socket ?? ''))
      rmSync(dirname(socket), { recursive: true, force: true })
  }
}

/**
 * Makes the data folder, or makes it again where an earlier attempt did not finish: the stamp is written last.
 * A folder without a stamp that nevertheless holds our schema is never touched.
 */
async function initialise(folder, schema) {
  const data = join(folder, 'data')
  const stamp = join(folder, 'initialised')
  if (existsSync(stamp)) return
  if (existsSync(join(data, schema))) {
    throw new CannotStart(
      `${folder} holds a database but not the mark of a finished set-up.\nMove it away to start afresh, or create an empty file ${stamp} if you put it there yourself.`,
    )
  }
  if (existsSync(folder)) {
    console.log('The database folder was only half made: making it again …')
    rmSync(folder, { recursive: true })
  }
  console.log('Initialising the database …')
  mkdirSync(folder, { recursive: true, mode: 0o700 })
  await run(INITIALISE, [
    '--no-defaults',
    ...userOption(),
    `--datadir=${data}`,
    '--auth-root-authentication-method=normal',
    '--skip-test-db',
    '--skip-name-resolve',
    '--force',
  ])
  writeFileSync(`${stamp}.new`, `${new Date().toISOString()}\n`)
  renameSync(`${stamp}.new`, stamp)
}

/**
 * The accounts, stated anew at every start before the first connection is let in: so there is no moment without
 * a password, and a lost secrets.json heals. Root through the private socket, one user for our schemas, no other.
 */
function accounts({ schema, user, secrets, withTestSchemas }) {
  const account = `'${user}'@'127.0.0.1'`
  return [
    `DELETE FROM mysql.global_priv WHERE NOT (User = 'root' AND Host = 'localhost') AND User NOT IN ('mariadb.sys', 'PUBLIC');`,
    'DELETE FROM mysql.db;',
    'FLUSH PRIVILEGES;',
    `ALTER USER 'root'@'localhost' IDENTIFIED BY '${secrets.databaseRootPassword}';`,
    `CREATE DATABASE IF NOT EXISTS \`${schema}\` CHARACTER SET utf8mb4 COLLATE utf8mb4_unicode_ci;`,
    `CREATE USER ${account} IDENTIFIED BY '${secrets.databasePassword}';`,
    `GRANT ALL ON \`${schema.replaceAll('_', '\\_')}\`.* TO ${account};`,
    ...(withTestSchemas ? [`GRANT ALL ON \`lavant\\_test%\`.* TO ${account};`] : []),
    '',
  ].join('\n')
}

/**
 * Waits until the server lets our user in. The client's word is not taken from the exit code alone: the answer
 * must come from the data folder that we started.
 */
async function ready({ port, user, password, data, hasEnded }) {
  for (const deadline = Date.now() + 90_000; Date.now() < deadline && !hasEnded(); ) {
    const answer = await new Promise((resolve) => {
      const client = spawn(
        CLIENT,
        [
          '--no-defaults',
          '--protocol=tcp',
          '--host=127.0.0.1',
          `--port=${port}`,
          `--user=${user}`,
          '--batch',
          '--skip-column-names',
        ],
        { env: { ...process.env, MYSQL_PWD: password }, stdio: ['pipe', 'pipe', 'ignore'] },
      )
      let text = ''
      client.stdout.on('data', (part) => {
        text += part
      })
      client.on('close', () => resolve(text.trim()))
      client.stdin.on('error', () => resolve(''))
      client.stdin.end('SELECT @@datadir;\n')
    })
    if (answer === `${data}/`) return
    await pause(100)
  }
  throw new CannotStart('The database does not answer.')
}

/**
 * Starts MariaDB on loopback with a data folder of its own.
 *
 * @param {object} options
 * @param {ReturnType<typeof import('./processes.js').createProcesses>} options.processes
 * @param {string} options.folder absolute; made when absent
 * @param {string} options.log absolute
 * @param {number} options.port
 * @param {string} options.portVariable named when the port is taken
 * @param {string} options.schema
 * @param {string} options.user
 * @param {ReturnType<typeof import('./secrets.js').secretsIn>} options.secrets
 * @param {boolean} options.throwAway small, quick to write, and with the right to make lavant_test… schemas
 */
export async function startMariadb({
  processes,
  folder,
  log,
  port,
  portVariable,
  schema,
  user,
  secrets,
  throwAway,
}) {
  const data = join(folder, 'data')
  await stopLeftovers(data)
  await claimPort(port, portVariable, 'the database')
  await initialise(folder, schema)
  // The path of a socket may have 107 characters at most, which a clone deep in a home folder would exceed.
  const nearby = mkdtempSync(join(tmpdir().length > 60 ? '/tmp' : tmpdir(), 'lavant-'))
  processes.afterwards(() => rmSync(nearby, { recursive: true, force: true }))
  const first = join(nearby, 'accounts.sql')
  writeFileSync(first, accounts({ schema, user, secrets, withTestSchemas: throwAway }), { mode: 0o600 })
  await processes.start({
    name: 'The database',
    command: SERVER,
    arguments: [
      '--no-defaults',
      ...userOption(),
      `--datadir=${data}`,
      `--socket=${join(nearby, 'mariadb.sock')}`,
      `--pid-file=${join(folder, 'mariadbd.pid')}`,
      `--init-file=${first}`,
      '--bind-address=127.0.0.1',
      `--port=${port}`,
      '--skip-name-resolve',
      '--skip-log-bin',
      '--local-infile=0',
      '--default-time-zone=+00:00',
      '--character-set-server=utf8mb4',
      '--collation-server=utf8mb4_unicode_ci',
      '--max-allowed-packet=64M',
      ...(throwAway
        ? ['--innodb-buffer-pool-size=256M', '--innodb-flush-log-at-trx-commit=0', '--innodb-doublewrite=0']
        : ['--innodb-buffer-pool-size=512M', '--innodb-log-file-size=256M']),
    ],
    environment: process.env,
    log,
    patience: 60_000,
    ready: (hasEnded) => ready({ port, user, password: secrets.databasePassword, data, hasEnded }),
  })
  rmSync(first)
}
