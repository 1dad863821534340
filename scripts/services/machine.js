import { execFileSync, spawnSync } from 'node:child_process'
import { existsSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { CannotStart } from './cannot-start.js'

/** What each Debian package is wanted for: the programs that must be there. */
const programs = {
  'mariadb-server-core': ['/usr/sbin/mariadbd', '/usr/bin/mariadb-install-db'],
  'mariadb-client-core': ['/usr/bin/mariadb'],
  chromium: ['/usr/bin/chromium'],
  'poppler-utils': ['/usr/bin/pdftotext', '/usr/bin/pdftoppm'],
}

/** Throws CannotStart unless this is the Node that package.json asks for. */
export function ensureNodeVersion(root) {
  const { engines } = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8'))
  const [, major, minor] = /^>=(\d+)\.(\d+) <\d+$/.exec(engines.node)
  const [ourMajor, ourMinor] = process.versions.node.split('.').map(Number)
  if (ourMajor !== Number(major) || ourMinor < Number(minor)) {
    throw new CannotStart(`Lavant needs Node ${engines.node}; this is Node ${process.versions.node}.`)
  }
}

/**
 * Installs the Debian packages whose programs are missing.
 * Throws CannotStart with the exact command for somebody who is not root.
 */
export function ensureDebianPackages(names) {
  const missing = names.filter((name) => !programs[name].every((program) => existsSync(program)))
  if (missing.length === 0) return
  const install = ['install', '--yes', '--no-install-recommends', ...missing]
  if (!existsSync('/usr/bin/apt-get')) {
    const wanted = missing.flatMap((name) => programs[name]).join(', ')
    throw new CannotStart(
      `These programs are missing: ${wanted}.\nThis is not Debian, so please install them yourself.`,
    )
  }
  if (process.getuid() !== 0) {
    throw new CannotStart(
      `Some Debian packages are missing, and only root can install them. Please run once:\n\n  sudo sh -c 'apt-get update && apt-get ${install.join(' ')}'\n\nand then start again.`,
    )
  }
  console.log(`Installing Debian packages: ${missing.join(', ')} …`)
  const env = { ...process.env, DEBIAN_FRONTEND: 'noninteractive' }
  for (const words of [['update'], install]) {
    const { status } = spawnSync('apt-get', ['--quiet', ...words], {
      env,
      stdio: ['ignore', 'ignore', 'inherit'],
    })
    if (status !== 0) throw new CannotStart(`apt-get ${words.join(' ')} failed; its own message is above.`)
  }
}

/**
 * Whether node_modules holds exactly what the lock file says. npm writes its record of the installed tree last,
 * so an installation that was interrupted does not count.
 */
function areNodePackagesInstalled(root) {
  const record = join(root, 'node_modules/.package-lock.json')
  if (!existsSync(record)) return false
  const wanted = JSON.parse(readFileSync(join(root, 'package-lock.json'), 'utf8')).packages
  const installed = JSON.parse(readFileSync(record, 'utf8')).packages
  // Optional packages for other kinds of machine are in the lock file only.
  const missing = Object.keys(wanted).some((path) => path && !wanted[path].optional && !installed[path])
  return !missing && Object.keys(installed).every((path) => installed[path].version === wanted[path]?.version)
}

/** Installs the npm packages of the lock file, developers' ones included whatever NODE_ENV says. */
export function ensureNodePackages(root) {
  if (areNodePackagesInstalled(root)) return
  console.log('Installing npm packages from the lock file …')
  const npm = process.env.npm_execpath
  const words = ['ci', '--include=dev', '--ignore-scripts', '--no-audit', '--no-fund']
  try {
    if (npm)
      execFileSync(process.execPath, [npm, ...words], { cwd: root, stdio: ['ignore', 'ignore', 'inherit'] })
    else execFileSync('npm', words, { cwd: root, stdio: ['ignore', 'ignore', 'inherit'] })
  } catch (error) {
    throw new CannotStart(`npm ci failed (${error.message.split('\n')[0]}); its own message is above.`)
  }
}
