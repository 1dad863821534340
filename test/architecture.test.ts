import { execFile } from 'node:child_process'
import { copyFileSync, mkdirSync, mkdtempSync, readdirSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { promisify } from 'node:util'
import { afterAll, expect, test } from 'vitest'

const root = join(import.meta.dirname, '..')
const scratch = mkdtempSync(join(tmpdir(), 'lavant-imports-'))
afterAll(() => rmSync(scratch, { recursive: true }))

/** The calc book's sections in their order: each may read those before it. */
const sections = [
  'basis',
  'ground',
  'water',
  'cases',
  'heads',
  'readings',
  'fit',
  'checks',
  'packages',
  'progress',
]
const below = [
  'projects',
  'book',
  'solver',
  'jobs',
  'files',
  'mail',
  'components',
  'units',
  'environment.server',
]

/** What each folder of app/ may import, itself aside. */
const allowed: Record<string, string[]> = {
  components: ['units'],
  solver: [],
  jobs: ['environment.server'],
  files: ['environment.server'],
  mail: ['environment.server'],
  'sign-in': ['projects', 'mail', 'units', 'environment.server'],
  projects: ['sign-in', 'mail', 'components', 'units', 'environment.server'],
  book: ['projects', 'components', 'units', 'environment.server'],
  ...Object.fromEntries(sections.map((section, index) => [section, [...below, ...sections.slice(0, index)]])),
}

function write(path: string, text: string): void {
  mkdirSync(join(scratch, path, '..'), { recursive: true })
  writeFileSync(join(scratch, path), text)
}

/** Paths, in the scratch folder, of the files that the project's linter refuses for an import. */
async function refused(): Promise<Set<string>> {
  const linter = join(root, 'node_modules/oxlint/bin/oxlint')
  // Its folders are relative to where it lies.
  copyFileSync(join(root, '.oxlintrc.json'), join(scratch, '.oxlintrc.json'))
  const words = [linter, '-c', '.oxlintrc.json', '--format', 'json', '--allow', 'all', '.']
  const { stdout } = await promisify(execFile)(process.execPath, words, { cwd: scratch }).catch((error) => {
    // It exits with 1 when it has something to say.
    if (error.code === 1) return error as { stdout: string }
    throw error
  })
  const { diagnostics } = JSON.parse(stdout) as { diagnostics: { code: string; filename: string }[] }
  return new Set(
    diagnostics.filter(({ code }) => code.includes('no-restricted-imports')).map(({ filename }) => filename),
  )
}

test('The linter refuses every import against the order of the book, and no other', async () => {
  const folders = Object.keys(allowed)
  const expected = new Set<string>()
  for (const from of folders) {
    for (const to of [...folders, 'units', 'environment.server', 'routes']) {
      const path = `app/${from}/to-${to}.tsx`
      const target = to === 'units' || to === 'environment.server' ? `~/${to}` : `~/${to}/something`
      write(path, `import { something } from '${target}'\nsomething()\n`)
      if (from !== to && !allowed[from]?.includes(to)) expected.add(path)
    }
    write(`app/${from}/upwards.tsx`, `import { something } from '../fit/something'\nsomething()\n`)
    write(`app/${from}/beside.tsx`, `import { something } from './something'\nsomething()\n`)
    write(`app/${from}/to-test.tsx`, `import { something } from '../../test/something'\nsomething()\n`)
    write(`app/${from}/proof.test.ts`, `import { something } from '../../test/something'\nsomething()\n`)
    expected.add(`app/${from}/upwards.tsx`).add(`app/${from}/to-test.tsx`)
  }
  write('app/root.tsx', `import { something } from '~/routes/home'\nsomething()\n`)
  write('scripts/serve.ts', `import { something } from '../app/routes/home'\nsomething()\n`)
  write('database/connection.server.ts', `import { something } from '../app/units'\nsomething()\n`)
  write('database/migrations/1.ts', `import { something } from '../../app/units'\nsomething()\n`)
  write('database/migrations/2.ts', `import knex from 'knex'\nknex()\n`)
  write('database/migrations/3.ts', `import type { Knex } from 'knex'\nexport type K = Knex\n`)
  write('app/solver/grid.ts', `import { Worker } from 'node:worker_threads'\nnew Worker('')\n`)
  write(
    'app/solver/solve.thread.ts',
    `import { parentPort } from 'node:worker_threads'\nparentPort?.close()\n`,
  )
  for (const path of ['app/root.tsx', 'scripts/serve.ts', 'database/connection.server.ts']) expected.add(path)
  for (const path of ['database/migrations/1.ts', 'database/migrations/2.ts', 'app/solver/grid.ts'])
    expected.add(path)

  const found = await refused()
  expect([...found].sort()).toEqual([...expected].sort())
})

test('Every folder of the application has its place in that order', () => {
  const folders = readdirSync(join(root, 'app'), { withFileTypes: true })
    .filter((entry) => entry.isDirectory())
    .map(({ name }) => name)
  expect(folders.filter((name) => name !== 'routes' && !allowed[name])).toEqual([])
})

test('No file or folder is named after being left over', () => {
  const leftOver = /^(utils?|helpers?|common|lib|shared|misc)([.-].*)?$/
  const named = ['app', 'database', 'scripts', 'test'].flatMap((folder) =>
    readdirSync(join(root, folder), { recursive: true, encoding: 'utf8' })
      .filter((path) => path.split('/').some((name) => leftOver.test(name)))
      .map((path) => `${folder}/${path}`),
  )
  expect(named).toEqual([])
})
