import { execFileSync } from 'node:child_process'
import { existsSync } from 'node:fs'
import { join } from 'node:path'

/** What the library says of one problem: seconds (medians) and iterations of its fastest configuration. */
export interface LibraryTime {
  setup: number
  solve: number
  iterations: number
}

/** Fastest configurations found for each kind of problem: relaxation, and HYPRE_SKIP where it matters. */
function configurations(name: string): { relax: string; environment: Record<string, string> }[] {
  if (!name.startsWith('P3')) return ['2', '1'].map((relax) => ({ relax, environment: {} }))
  return [
    { relax: '1', environment: { HYPRE_SKIP: '0' } },
    { relax: '1', environment: {} },
  ]
}

/** The folder of the library's program, or null: LAVANT_BENCH_ANCHORS. Throws when it is not there. */
export function anchorsFolder(): string | null {
  const folder = process.env.LAVANT_BENCH_ANCHORS
  if (!folder) return null
  if (!existsSync(join(folder, 'hypre_struct'))) {
    throw new Error(`LAVANT_BENCH_ANCHORS: there is no hypre_struct in ${folder}.`)
  }
  return folder
}

/** Runs the library on a problem file, conjugate gradients with its structured multigrid, on so many processes. */
export function timeLibrary(
  folder: string,
  name: string,
  file: string,
  threads: number,
  repeats: number,
): LibraryTime {
  const times = configurations(name).map(({ relax, environment }) => {
    const program = [join(folder, 'hypre_struct'), file, 'pcg-pfmg', relax, '0', '1', '1', String(repeats)]
    const two = [
      'mpirun',
      '--allow-run-as-root',
      '--oversubscribe',
      '--bind-to',
      'core',
      '-np',
      String(threads),
    ]
    const [command, ...words] = threads > 1 ? [...two, ...program] : program
    const { OPENBLAS_CORETYPE: _type, OPENBLAS_L2_SIZE: _size, ...inherited } = process.env
    const said = execFileSync(command as string, words, {
      encoding: 'utf8',
      env: { ...inherited, OMP_NUM_THREADS: '1', ...environment },
      stdio: ['ignore', 'pipe', 'ignore'],
    })
    const line = said.split('\n').find((text) => text.startsWith('{'))
    const { setup, solve, its } = JSON.parse(line ?? '{}')
    return { setup, solve, iterations: its } as LibraryTime
  })
  return times.reduce((best, time) => (time.setup + time.solve < best.setup + best.solve ? time : best))
}
