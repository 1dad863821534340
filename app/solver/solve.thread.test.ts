import { join } from 'node:path'
import { pathToFileURL } from 'node:url'
import { Worker } from 'node:worker_threads'
import { describe, expect, it } from 'vitest'
import { decodeHeads } from './heads-buffer'
import type { Model } from './model'
import type { SolveMessage, SolveRequest } from './solve.thread'

function model(columns: number, kx = 1): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 100], y: [0, 100] },
    grid: { columns, rows: columns },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx, ky: 1 }],
    ground: [{ material: 'Sand', base: 0, top: 10 }],
    boundaries: [
      {
        name: 'West',
        kind: 'fixed head',
        line: [
          [0, 0],
          [0, 100],
        ],
        head: 12,
      },
    ],
    recharge: [{ name: 'Rain', rate: 0.001 }],
  }
}

function onThread(request: SolveRequest, onProgress: () => void = () => {}): Promise<SolveMessage> {
  // A thread of Node 20 does not take over `--import tsx`: it registers tsx itself, then loads the source.
  const source = JSON.stringify(pathToFileURL(join(import.meta.dirname, 'solve.thread.ts')).href)
  const code = `import('tsx/esm/api').then(({ register }) => { register(); return import(${source}) })`
  const worker = new Worker(code, { eval: true, workerData: request })
  return new Promise((resolve, reject) => {
    worker.on('error', reject)
    worker.on('message', (message: SolveMessage) => {
      if (message.kind === 'progress') onProgress()
      else resolve(message)
    })
  })
}

describe('a solve on its own thread', () => {
  it('ends with the result, its input hash and the heads in one buffer', async () => {
    const message = await onThread({ model: model(12), input: 'sha256:abc' })
    if (message.kind !== 'done') throw new Error(message.kind)
    expect(message.result.input).toBe('sha256:abc')
    expect(message.result.converged).toBe(true)
    expect(decodeHeads(message.buffer).heads).toHaveLength(144)
  })

  it('sends the heads of every reported time of a model in time', async () => {
    const inTime: Model = {
      ...model(6),
      materials: [{ name: 'Sand', kx: 1, ky: 1, specificStorage: 1e-4 }],
      time: { kind: 'transient', initialHead: 12, stages: [{ duration: 1 }, { duration: 2 }] },
    }
    const message = await onThread({ model: inTime })
    if (message.kind !== 'done') throw new Error(JSON.stringify(message))
    const { heads, fields } = decodeHeads(message.buffer)
    expect(message.result.times).toEqual([1, 3])
    expect(fields.map(({ time }) => time)).toEqual([0, 1, 3])
    expect(new Set(fields[0]?.heads)).toEqual(new Set([12]))
    expect(heads).toEqual(fields[2]?.heads)
    expect(heads[5]).toBeGreaterThan(12)
  })

  it('says where a model is refused', async () => {
    expect(await onThread({ model: model(12, 0) })).toMatchObject({
      kind: 'refused',
      path: 'materials[0].kx',
    })
  })

  it('stops soon after it is told to', async () => {
    const cancel = new Int32Array(new SharedArrayBuffer(4))
    const message = await onThread({ model: model(900), cancel }, () => Atomics.store(cancel, 0, 1))
    expect(message).toEqual({ kind: 'cancelled' })
  })
})
