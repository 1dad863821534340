import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { compileKernels } from '../scripts/compile-kernels.ts'

const root = dirname(dirname(fileURLToPath(import.meta.url)))

/** Before all tests: the solver's kernels, where solverKernels() looks for them when nothing is built. */
export default async function setup(): Promise<void> {
  await compileKernels(join(root, '.data/kernels'))
}
