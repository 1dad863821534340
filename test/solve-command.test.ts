import { spawnSync } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, describe, expect, it } from 'vitest'
import { decodeHeads } from '../app/solver/heads-buffer'
import type { Model } from '../app/solver/model'
import type { Result } from '../app/solver/result'

const folder = mkdtempSync(join(tmpdir(), 'lavant-solve-'))
afterAll(() => rmSync(folder, { recursive: true }))

/** A strip held at 12 m in the west; `changes` replace its fields. */
function strip(changes: object = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 100], y: [0, 20] },
    grid: { columns: 10, rows: 2 },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 10, ky: 10, specificStorage: 1e-4 }],
    ground: [{ material: 'Sand', base: 0, top: 10 }],
    boundaries: [
      {
        name: 'West',
        kind: 'fixed head',
        line: [
          [0, 0],
          [0, 20],
        ],
        head: 12,
      },
    ],
    recharge: [{ name: 'Rain', rate: 0.001 }],
    ...changes,
  }
}

function solve(model: object, ...options: string[]) {
  const file = join(folder, 'model.json')
  writeFileSync(file, JSON.stringify(model))
  const { status, stdout, stderr } = spawnSync(
    process.execPath,
    ['--import', 'tsx', 'scripts/solve.ts', file, ...options],
    { cwd: join(import.meta.dirname, '..'), encoding: 'utf8' },
  )
  return { status, stdout, stderr }
}

describe('npm run solve', () => {
  it('prints the result alone and ends with 0, the heads of every reported time in a file', () => {
    const heads = join(folder, 'heads.bin')
    const time = { kind: 'transient', initialHead: 12, stages: [{ duration: 1 }, { duration: 5 }] }
    const { status, stdout, stderr } = solve(strip({ time }), '--heads', heads)
    expect([status, stderr]).toEqual([0, ''])
    const result = JSON.parse(stdout) as Result & { heads: string }
    expect(result).toMatchObject({ format: 'lavant-result', converged: true, times: [1, 6], heads })
    expect(decodeHeads(readFileSync(heads)).fields.map((field) => field.time)).toEqual([0, 1, 6])
  })

  it('ends with 2 and says where, for a file that is refused', () => {
    const { status, stdout, stderr } = solve(
      strip({ materials: [{ name: 'Sand', kx: 10, ky: 10, colour: 'red' }] }),
    )
    expect([status, stdout]).toEqual([2, ''])
    expect(stderr).toBe('materials[0].colour: is not a field of the model file\n')
    expect(solve(strip(), '--fast')).toMatchObject({ status: 2, stderr: 'there is no option --fast\n' })
  })
})
