import { describe, expect, it } from 'vitest'
import { parseModelFile } from './model-file'
import { modelHash } from './model-hash.server'

function file(changes: Record<string, unknown> = {}): Record<string, unknown> {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 10], y: [0, 10] },
    grid: { columns: 2, rows: 2 },
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 1, ky: 1 }],
    ground: [{ material: 'Sand', base: 0, top: 1 }],
    ...changes,
  }
}

function errors(json: unknown): Record<string, string> {
  const parsed = parseModelFile(json)
  if (parsed.ok) throw new Error('the file was accepted')
  return Object.fromEntries(parsed.errors.map(({ path, message }) => [path, message]))
}

describe('the model file', () => {
  it('comes through as it was written, nothing filled in', () => {
    const json = file()
    const parsed = parseModelFile(json)
    expect(parsed).toEqual({ ok: true, model: json })
  })

  it('refuses unknown fields anywhere, with their path', () => {
    expect(errors(file({ colour: 'red' }))).toHaveProperty('colour')
    const well = { name: 'W', x: 1, y: 1, kind: 'abstraction', rate: 1, rat: 2 }
    expect(errors(file({ wells: [well] }))).toHaveProperty(['wells[0].rat'])
    expect(errors(file({ grid: { columns: 2, rows: 2, layers: 3 } }))).toHaveProperty(['grid.layers'])
  })

  it('says what is missing and where', () => {
    const { grid: _, ...rest } = file()
    expect(errors(rest)).toEqual({ grid: 'is needed' })
    const boundary = {
      name: 'B',
      kind: 'fixed head',
      line: [
        [0, 0],
        [0, 1],
      ],
    }
    expect(errors(file({ boundaries: [boundary] }))).toEqual({ 'boundaries[0].head': 'is needed' })
    expect(errors(null)).toHaveProperty(['the file'])
  })

  it('refuses numbers that are none, and another format or version', () => {
    expect(errors(file({ materials: [{ name: 'Sand', kx: '1', ky: 1 }] }))).toHaveProperty([
      'materials[0].kx',
    ])
    expect(errors(file({ materials: [{ name: 'Sand', kx: -1, ky: 1 }] }))).toHaveProperty(['materials[0].kx'])
    expect(errors(file({ version: 2 }))).toHaveProperty('version')
    expect(errors(file({ format: 'other' }))).toHaveProperty('format')
  })

  it('names the first wrong entries of a list and reads no further, however many there are', () => {
    const begun = performance.now()
    const wrong = errors(file({ materials: Array(1_000_000).fill(0) }))
    expect(Object.keys(wrong)).toHaveLength(20)
    expect(wrong).toHaveProperty(['materials[19]'])
    expect(performance.now() - begun).toBeLessThan(2000)
    const few = { name: 'B', kind: 'fixed head', line: [[0, 0]], head: 1 }
    expect(errors(file({ boundaries: [few] }))).toHaveProperty(['boundaries[0].line'])
    const many = Object.fromEntries(Array.from({ length: 5000 }, (_, k) => [`field${k}`, 1]))
    expect(Object.keys(errors(file(many)))).toHaveLength(20)
  })

  it('reads what this version does not compute, so that the engine can refuse it by name', () => {
    const time = {
      kind: 'transient',
      initialHead: 'steady',
      stages: [{ name: 'S', duration: 3, steps: 'automatic' }],
    }
    expect(parseModelFile(file({ time, want: { verify: true } })).ok).toBe(true)
  })

  it('reads the toe of a wall and the screen of a well', () => {
    const line = [
      [0, 0],
      [0, 9],
    ]
    const wall = { name: 'Cut-off', line, thickness: 1, k: 0, toe: -3 }
    const well = { name: 'W', x: 1, y: 1, kind: 'abstraction', rate: 1, screen: { top: 4, bottom: 1 } }
    expect(parseModelFile(file({ walls: [wall], wells: [well] })).ok).toBe(true)
    expect(errors(file({ walls: [{ ...wall, toe: 'deep' }] }))).toHaveProperty(['walls[0].toe'])
    expect(errors(file({ wells: [{ ...well, screen: { top: 4 } }] }))).toHaveProperty([
      'wells[0].screen.bottom',
    ])
  })

  it('has one hash whatever the order of its fields, and another for every change', () => {
    const json = file()
    const turned = Object.fromEntries(Object.entries(json).reverse())
    expect(modelHash(turned)).toBe(modelHash(json))
    expect(modelHash(json)).toMatch(/^sha256:[0-9a-f]{64}$/)
    expect(modelHash(file({ title: 'x' }))).not.toBe(modelHash(json))
    const parsed = parseModelFile(json)
    expect(parsed.ok && modelHash(parsed.model)).toBe(modelHash(json))
  })
})
