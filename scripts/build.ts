import { spawnSync } from 'node:child_process'
import { cpSync, rmSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { compileKernels } from './compile-kernels.ts'
import { sourcesHash, stampBuild } from './services/build-stamp.ts'

const root = dirname(dirname(fileURLToPath(import.meta.url)))

function runPackage(script: string, words: string[], variables: Record<string, string> = {}): void {
  const { status } = spawnSync(process.execPath, [join(root, 'node_modules', script), ...words], {
    cwd: root,
    env: { ...process.env, NODE_ENV: 'production', ...variables },
    stdio: ['ignore', 'inherit', 'inherit'],
  })
  if (status !== 0) process.exit(status ?? 1)
}

const hash = sourcesHash(root)
rmSync(join(root, 'build'), { recursive: true, force: true })
runPackage('@react-router/dev/bin.js', ['build', '--logLevel', 'warn'])
// After the application, whose build empties the folder.
runPackage('vite/bin/vite.js', ['build', '--logLevel', 'warn'], { LAVANT_BUILD: 'threads' })
// The server's threads read the kernels of the solver from the one place, browsers fetch them from the other.
await compileKernels(join(root, 'build/kernels'))
cpSync(join(root, 'build/kernels/solver.wasm'), join(root, 'build/client/kernels/solver.wasm'))
stampBuild(root, hash)
