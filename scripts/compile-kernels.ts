import { createHash } from 'node:crypto'
import { existsSync, mkdirSync, readdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'

const root = dirname(dirname(fileURLToPath(import.meta.url)))
const folder = join(root, 'app/solver/linear/kernels')

/** Memory is the caller's, of up to as many pages as there are addresses. */
const memory = ['--importMemory', '--maximumMemory', '65536']
const flags = ['--runtime', 'stub', '--noAssert', '--enable', 'simd', ...memory, '-O3']

function sources(): Map<string, string> {
  const names = readdirSync(folder).filter((name) => name.endsWith('.as'))
  return new Map(names.sort().map((name) => [name, readFileSync(join(folder, name), 'utf8')]))
}

async function compile(files: Map<string, string>): Promise<Uint8Array> {
  const { default: asc } = await import('assemblyscript/asc')
  let binary: Uint8Array | null = null
  const complaints: string[] = []
  const words = ['solver.ts', '--outFile', 'solver.wasm', ...flags]
  const { error } = await asc.main(words, {
    // The kernels end in .as, which keeps compilers of another TypeScript out of them.
    readFile: (name: string) => files.get(name.replace(/\.ts$/, '.as')) ?? null,
    writeFile: (_name: string, contents: Uint8Array | string) => {
      if (typeof contents !== 'string') binary = contents
    },
    listFiles: () => [],
    stderr: { write: (chunk: string | Uint8Array) => complaints.push(chunk.toString()) },
  } as never)
  if (error || !binary) throw new Error(`The kernels do not compile.\n${complaints.join('')}`)
  return binary
}

/**
 * Compiles app/solver/linear/kernels to `into`/solver.wasm, unless that is there already for the same sources: their
 * hash lies beside it.
 */
export async function compileKernels(into: string): Promise<void> {
  const files = sources()
  const digest = createHash('sha256')
    .update(JSON.stringify([...files, flags]))
    .digest('hex')
  const mark = join(into, 'kernels.sha256')
  const path = join(into, 'solver.wasm')
  if (existsSync(path) && existsSync(mark) && readFileSync(mark, 'utf8') === digest) return
  mkdirSync(into, { recursive: true })
  // Written beside and renamed: another process may be reading.
  writeFileSync(`${path}.${process.pid}`, await compile(files))
  renameSync(`${path}.${process.pid}`, path)
  writeFileSync(mark, digest)
}
