import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { pathToFileURL } from 'node:url'
import { Worker } from 'node:worker_threads'
import { afterEach, describe, expect, it } from 'vitest'
import { instantiateKernels, type Kernels, withTwoThreads } from './kernels'
import { prepareMultigrid } from './multigrid'
import type { LinearSystem } from './system'
import type { SharedTask } from './team'

const one = instantiateKernels(new Uint8Array(readFileSync(join(process.cwd(), '.data/kernels/solver.wasm'))))
const n = 200
const target = 1e-9

/** Ground that varies from column to column, held on the west, with a well in it. */
function problem(): { system: LinearSystem; b: Float64Array } {
  const numbers = () => new Float64Array(n * n)
  const [east, north, own, b] = [numbers(), numbers(), numbers(), numbers()]
  for (let c = 0; c < n * n; c++) {
    const i = c % n
    if (i < n - 1) east[c] = 1 + (i % 7)
    if (c < n * (n - 1)) north[c] = 1 + (i % 5)
    if (i === 0) own[c] = 3
  }
  b[77 * n + 120] = -1
  return { system: { columns: n, rows: n, east, north, northEast: null, northWest: null, own }, b }
}

let workers: Worker[] = []
afterEach(async () => {
  for (const worker of workers) await worker.terminate()
  workers = []
})

async function started(): Promise<Worker> {
  const source = JSON.stringify(pathToFileURL(join(process.cwd(), 'app/solver/linear/second.thread.ts')).href)
  const code = `import('tsx/esm/api').then(({ register }) => { register(); return import(${source}) })
    .then(() => require('node:worker_threads').parentPort.postMessage('ready'))`
  const worker = new Worker(code, { eval: true })
  workers.push(worker)
  await new Promise((resolve) => worker.once('message', resolve))
  return worker
}

function solved(
  kernels: Kernels,
  solves: number,
  between?: () => void,
): { heads: Float64Array; milliseconds: number } {
  const { system, b } = problem()
  const prepared = prepareMultigrid(system, kernels)
  const begun = performance.now()
  let heads = new Float64Array(n * n)
  for (let k = 0; k < solves; k++) {
    heads = new Float64Array(n * n)
    const outcome = prepared.solve(b, heads, {
      target,
      mostIterations: 60,
      watch: () => {
        between?.()
        return false
      },
    })
    expect(outcome.ended).toBe('converged')
    expect(outcome.residual).toBeLessThanOrEqual(target)
  }
  return { heads, milliseconds: performance.now() - begun }
}

function apart(a: Float64Array, b: Float64Array): number {
  return a.reduce((most, value, c) => Math.max(most, Math.abs(value - (b[c] as number))), 0)
}

describe('two threads on one system', () => {
  const alone = solved(one, 1).heads

  it('find the heads that one thread finds', async () => {
    const worker = await started()
    let tasks = 0
    const two = withTwoThreads(one, {
      post(task) {
        tasks++
        worker.postMessage(task)
      },
    })
    expect(apart(solved(two, 20).heads, alone)).toBeLessThan(1e-9)
    expect(tasks).toBeGreaterThan(0)
  })

  it('are one when the second never comes', () => {
    const { heads, milliseconds } = solved(withTwoThreads(one, { post: () => {} }), 1)
    expect(apart(heads, alone)).toBe(0)
    expect(milliseconds).toBeLessThan(30_000)
  })

  it('go on as one when the second is lost in the middle of a solve', async () => {
    const worker = await started()
    let told: SharedTask | null = null
    const kernels = withTwoThreads(one, {
      post(task) {
        told = task
        worker.postMessage(task)
      },
    })
    let iterations = 0
    const { heads } = solved(kernels, 1, () => {
      iterations++
      // A thread that is ended stops at its next turn in JavaScript; meanwhile it may still write.
      if (iterations === 2) void worker.terminate()
    })
    expect(told).not.toBeNull()
    expect(apart(heads, alone)).toBeLessThan(1e-9)
  })

  it('leave small systems to one', () => {
    let tasks = 0
    const kernels = withTwoThreads(one, { post: () => tasks++ })
    const system: LinearSystem = {
      columns: 20,
      rows: 1,
      east: new Float64Array(20).fill(1, 0, 19),
      north: new Float64Array(20),
      northEast: null,
      northWest: null,
      own: new Float64Array(20).fill(1),
    }
    prepareMultigrid(system, kernels).solve(new Float64Array(20).fill(1), new Float64Array(20), {
      target,
      mostIterations: 20,
    })
    expect(tasks).toBe(0)
  })
})
