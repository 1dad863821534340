import { createHash } from 'node:crypto'
import { existsSync, mkdirSync, readdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'

const root = dirname(dirname(fileURLToPath(import.meta.url)))
const folder = join(root, 'app/solver/linear/kernels')

/** Memory is the caller's; one that threads share must say how large it may grow. */
const flags = ['--runtime', 'stub', '--noAssert', '--enable', 'simd', '--importMemory', '-O3']
const sharedFlags = ['--enable', 'threads', '--sharedMemory', '--maximumMemory', '65536']

function sources(): Map<string, string> {
  const names = readdirSync(folder).filter((name) => name.endsWith('.as'))
  return new Map(names.sort().map((name) => [name, readFileSync(join(folder, name), 'utf8')]))
}

async function compile(files: Map<string, string>, shared: boolean): Promise<Uint8Array> {
  const { default: asc } = await import('assemblyscript/asc')
  let binary: Uint8Array | null = null
  const complaints: string[] = []
  const words = ['solver.ts', '--outFile', 'solver.wasm', ...flags, ...(shared ? sharedFlags : [])]
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
 * Compiles app/solver/linear/kernels into `into` (solver.wasm, and solver-shared.wasm for memory that threads share)
 * unless that is there already for the same sources; the folder carries their hash. Returns the folder of the files.
 */
export async function compileKernels(into: string): Promise<string> {
  const files = sources()
  const hash = createHash('sha256').update(JSON.stringify([...files, flags, sharedFlags]))
  const mark = join(into, 'kernels.sha256')
  const digest = hash.digest('hex')
  if (existsSync(mark) && readFileSync(mark, 'utf8') === digest) return into
  mkdirSync(into, { recursive: true })
  for (const shared of [false, true]) {
    const path = join(into, shared ? 'solver-shared.wasm' : 'solver.wasm')
    // Written beside and renamed: another process may be reading.
    writeFileSync(`${path}.${process.pid}`, await compile(files, shared))
    renameSync(`${path}.${process.pid}`, path)
  }
  writeFileSync(mark, digest)
  return into
}
