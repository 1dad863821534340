import { readFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath, pathToFileURL } from 'node:url'
import { Worker } from 'node:worker_threads'
import { instantiateKernels, type Kernels, withTwoThreads } from '../../app/solver/linear/kernels.ts'
import { compileKernels } from '../compile-kernels.ts'

const root = dirname(dirname(dirname(fileURLToPath(import.meta.url))))

export interface BenchKernels {
  bytes: Uint8Array<ArrayBuffer>
  path: string
  one: Kernels
  two: Kernels
  end: () => Promise<void>
}

/** The solver's kernels for one thread and for two; `end` stops the second thread. */
export async function benchKernels(): Promise<BenchKernels> {
  await compileKernels(join(root, '.data/kernels'))
  const path = join(root, '.data/kernels/solver.wasm')
  const bytes = new Uint8Array(readFileSync(path))
  const one = instantiateKernels(bytes)
  const source = pathToFileURL(join(root, 'app/solver/linear/second.thread.ts')).href
  const code = `import('tsx/esm/api').then(({ register }) => { register(); return import(${JSON.stringify(source)}) })
    .then(() => require('node:worker_threads').parentPort.postMessage('ready'))`
  const worker = new Worker(code, { eval: true })
  await new Promise<void>((resolve, reject) => {
    worker.once('message', () => resolve())
    worker.once('error', reject)
  })
  const two = withTwoThreads(one, { post: (task) => worker.postMessage(task) })
  return {
    bytes,
    path,
    one,
    two,
    end: async () => {
      await worker.terminate()
    },
  }
}
