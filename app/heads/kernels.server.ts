import { existsSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { instantiateKernels, type Kernels } from '~/solver/linear/kernels'

/** Where the build leaves them, and where scripts and tests do. */
const places = ['build/kernels/solver.wasm', '.data/kernels/solver.wasm']

let kernels: Kernels | undefined
let sought = false

/**
 * The solver's compiled kernels, read and compiled once a process; undefined where there are none or the machine cannot
 * run them: then the solver's TypeScript serves. They can be passed to threads.
 */
export function solverKernels(): Kernels | undefined {
  if (sought) return kernels
  sought = true
  const first = process.env.NODE_ENV === 'production' ? places : [...places].reverse()
  const path = first.map((place) => join(process.cwd(), place)).find((place) => existsSync(place))
  if (!path) return undefined
  try {
    kernels = instantiateKernels(new Uint8Array(readFileSync(path)))
  } catch (error) {
    if (!(error instanceof WebAssembly.CompileError)) throw error
    console.error(`The solver's kernels do not run here: ${error.message}`)
  }
  return kernels
}
