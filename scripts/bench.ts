/**
 * npm run bench [-- --quick] [--plot FILE.svg]
 *
 * Times the linear solver on three kinds of problems (scripts/bench/problems.ts), with one thread and with two; live
 * moves of a well in Node and in headless Chromium's web worker; and whole runs. With LAVANT_BENCH_ANCHORS=DIR, a folder
 * with the program hypre_struct in it, the same problems are given to that library's structured multigrid in the same
 * run, turn about; otherwise its columns say "not measured". --plot writes cost per cell against cells as a picture.
 *
 * npm run bench -- --problem FILE [--threads 1|2] [--method multigrid|sor|typescript]
 *
 * One JSON line for one problem file: seconds (medians), iterations, true relative residual, bytes a cell.
 *
 * npm run bench -- --run steady|steps|unconfined|sor [--cells N]
 *
 * One JSON line for one whole run on N x N cells, in a process of its own.
 */
import { execFileSync } from 'node:child_process'
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { cpus, tmpdir } from 'node:os'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { anchorsFolder, type LibraryTime, timeLibrary } from './bench/anchors.ts'
import { type EngineTime, runs } from './bench/engine.ts'
import { type BenchKernels, benchKernels } from './bench/kernels.ts'
import { type LiveTime, moveOneWell } from './bench/live.ts'
import { moveOneWellInBrowser } from './bench/live-in-browser.ts'
import { type Measured, measure } from './bench/measure.ts'
import { measureSor } from './bench/over-relaxation.ts'
import { type Cost, costPlot } from './bench/plot.ts'
import { readProblem, writeProblem } from './bench/problem-file.ts'
import { type Kind, problemOf } from './bench/problems.ts'
import { triadBandwidth } from './bench/timing.ts'

const kinds: Kind[] = ['P1', 'P2', 'P3']
/** Bytes that a cell must move to and from memory in one iteration, where no cache holds it. */
const bytesMoved = 160

class Refusal extends Error {}

function optionOf(words: string[], option: string): string | undefined {
  const at = words.indexOf(option)
  if (at < 0) return undefined
  const value = words[at + 1]
  if (value === undefined || value.startsWith('--')) throw new Refusal(`${option} needs a value`)
  return value
}

function repeatsFor(cells: number): number {
  return cells <= 70_000 ? 25 : cells <= 300_000 ? 11 : cells <= 1_100_000 ? 5 : 3
}

function milliseconds(seconds: number): string {
  return (1000 * seconds).toFixed(1).padStart(9)
}

function row(words: string[]): void {
  console.log(words.join(' '))
}

async function oneProblem(file: string, words: string[]): Promise<void> {
  const threads = Number(optionOf(words, '--threads') ?? 1)
  const method = optionOf(words, '--method') ?? 'multigrid'
  if (threads !== 1 && threads !== 2) throw new Refusal('--threads is 1 or 2')
  if (!['multigrid', 'sor', 'typescript'].includes(method)) {
    throw new Refusal('--method is multigrid, sor or typescript')
  }
  const problem = readProblem(file)
  const repeats = repeatsFor(problem.b.length)
  const kernels = await benchKernels()
  const means = method === 'typescript' ? undefined : threads === 2 ? kernels.two : kernels.one
  const measured = method === 'sor' ? measureSor(problem) : measure(problem, means, repeats)
  const name = method === 'sor' ? 'typescript' : (means?.name ?? 'typescript')
  console.log(
    JSON.stringify({
      problem: problem.name,
      method,
      threads: method === 'multigrid' ? threads : 1,
      kernels: name,
      ...measured,
    }),
  )
  await kernels.end()
}

function tableLine(name: string, threads: number, ours: Measured, library: LibraryTime | null): void {
  const total = ours.setup + ours.solve
  const theirs = library ? library.setup + library.solve : 0
  row([
    name.padEnd(8),
    String(threads).padStart(7),
    milliseconds(ours.setup),
    milliseconds(ours.solve),
    milliseconds(total),
    String(ours.iterations).padStart(5),
    ours.residual.toExponential(1).padStart(9),
    ours.bytesPerCell.toFixed(0).padStart(7),
    library ? milliseconds(theirs) : ' not measured',
    library ? String(library.iterations).padStart(5) : '',
    library ? (total / theirs).toFixed(2).padStart(6) : '',
  ])
}

/** The table; returns what a cell costs on one thread. */
function linearTable(kernels: BenchKernels, sizes: number[], anchors: string | null): Map<Kind, Cost[]> {
  const folder = mkdtempSync(join(tmpdir(), 'lavant-bench-'))
  const costs = new Map<Kind, Cost[]>(kinds.map((kind) => [kind, []]))
  row(['\nproblem  threads   set-up     solve    total   iter  residual  bytes/     library        ratio'])
  row(['                       ms        ms       ms                    cell     ms, iterations'])
  try {
    for (const kind of kinds) {
      for (const n of sizes) {
        const problem = problemOf(kind, n)
        const repeats = repeatsFor(n * n)
        const file = join(folder, `${kind}_${n}.bin`)
        if (anchors) writeProblem(file, problem)
        for (const threads of [1, 2]) {
          const ours = measure(problem, threads === 2 ? kernels.two : kernels.one, repeats)
          const library = anchors
            ? timeLibrary(anchors, problem.name, file, threads, Math.min(repeats, 7))
            : null
          tableLine(problem.name, threads, ours, library)
          if (threads === 1) costs.get(kind)?.push({ n, seconds: ours.setup + ours.solve })
        }
        rmSync(file, { force: true })
      }
    }
  } finally {
    rmSync(folder, { recursive: true, force: true })
  }
  return costs
}

function liveTable(where: string, times: LiveTime[] | null): void {
  if (!times) {
    row([where.padEnd(28), 'not measured: no Chromium here'])
    return
  }
  for (const { kind, middle, p95 } of times) {
    row([where.padEnd(28), kind, `${middle.toFixed(2).padStart(7)} ms`, `${p95.toFixed(2).padStart(7)} ms`])
  }
}

/** In a process of its own, so that the memory it takes can be told. */
function wholeRun(name: string, cells: number): void {
  const words = ['--import', 'tsx', fileURLToPath(import.meta.url), '--run', name, '--cells', String(cells)]
  const time: EngineTime = JSON.parse(execFileSync(process.execPath, words, { encoding: 'utf8' }))
  row([
    time.what.padEnd(34),
    `${time.seconds.toFixed(2).padStart(8)} s`,
    `${((100 * time.linearSeconds) / time.seconds).toFixed(0).padStart(3)} % in linear solves`,
    `${String(time.iterations).padStart(7)} iterations`,
    `residual ${time.residual.toExponential(1)}`,
    time.converged ? 'converged' : 'NOT CONVERGED',
    `${(time.memory / 1e6).toFixed(0)} MB`,
  ])
}

/** What wholeRun starts: one JSON line. */
async function oneRun(name: string, words: string[]): Promise<void> {
  const run = runs[name]
  const cells = Number(optionOf(words, '--cells') ?? 512)
  if (!run || !(cells >= 32))
    throw new Refusal(`--run is one of ${Object.keys(runs).join(', ')}, --cells 32 or more`)
  const kernels = await benchKernels()
  console.log(JSON.stringify(run(cells, kernels.one)))
  await kernels.end()
}

async function everything(words: string[]): Promise<void> {
  const quick = words.includes('--quick')
  const sizes = quick ? [128, 256] : [128, 256, 512, 1024, 2048]
  const anchors = anchorsFolder()
  const kernels = await benchKernels()
  const machine = `${cpus()[0]?.model.trim() ?? 'unknown processor'}, ${cpus().length} cores`
  const date = new Date().toISOString().slice(0, 10)
  console.log(`${date}, ${machine}, Node ${process.versions.node}`)
  const bandwidth = triadBandwidth()
  console.log(
    `Memory bandwidth (triad, one thread): ${(bandwidth / 1e9).toFixed(1)} GB/s. At ${bytesMoved} bytes a cell and` +
      ` iteration no solve outside the caches can take less than ${((1e9 * bytesMoved) / bandwidth).toFixed(1)} ns for that.`,
  )
  const costs = linearTable(kernels, sizes, anchors)
  const plot = optionOf(words, '--plot')
  if (plot) {
    const lines = kinds.map((name) => ({ name, costs: costs.get(name) ?? [] }))
    writeFileSync(plot, costPlot(lines, `one thread, ${machine}, ${date}`))
  }
  console.log('\nOne well moved on 256 x 256 cells, from the heads before: median and 95th percentile')
  const moves = quick ? 100 : 400
  liveTable(
    'Node',
    kinds.map((kind) => moveOneWell(kernels.bytes, kind, 256, moves)),
  )
  liveTable('Chromium, web worker', await moveOneWellInBrowser(kernels.path, kinds, 256, moves))
  console.log('\nWhole runs, model in and results out')
  const side = quick ? 128 : 512
  wholeRun('steady', side)
  wholeRun('steps', side)
  wholeRun('unconfined', side)
  wholeRun('sor', 128)
  wholeRun('steady', quick ? 512 : 2048)
  await kernels.end()
}

try {
  const words = process.argv.slice(2)
  const file = optionOf(words, '--problem')
  const run = optionOf(words, '--run')
  if (run) await oneRun(run, words)
  else if (file) await oneProblem(file, words)
  else await everything(words)
} catch (error) {
  if (!(error instanceof Refusal)) throw error
  console.error(error.message)
  process.exitCode = 2
}
