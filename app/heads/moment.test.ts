import { describe, expect, it } from 'vitest'
import type { Model } from '~/solver/model'
import { solveModel } from '~/solver/solve'
import { momentInWords, resultAt, storageFlow, totalFlow } from './moment'

/** A strip that a river falls beside, in two stages; everything that a result lists by time is in it. */
function falling(time: Model['time']): Model {
  const square: [number, number][] = [
    [20, 5],
    [80, 5],
    [80, 15],
    [20, 15],
  ]
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 100], y: [0, 20] },
    grid: { columns: 20, rows: 4 },
    time,
    materials: [{ name: 'Sand', kx: 10, ky: 10, specificStorage: 1e-4 }],
    ground: [{ material: 'Sand', base: 0, top: 10 }],
    boundaries: [
      {
        name: 'River',
        kind: 'fixed head',
        line: [
          [0, 0],
          [0, 20],
        ],
        head: time.kind === 'steady' ? 12 : { stages: [12, 11] },
      },
    ],
    recharge: [{ name: 'Rain', rate: 0.001 }],
    leakage: [{ name: 'Aquitard', head: 12, leakance: 1e-5 }],
    wells: [{ name: 'W1', x: 72, y: 11, kind: 'abstraction', rate: 3, radius: 0.1 }],
    points: [{ name: 'P1', x: 60, y: 8 }],
    lines: [
      {
        name: 'Across',
        line: [
          [50, 0],
          [50, 20],
        ],
      },
    ],
    rings: [{ name: 'Site', polygon: square }],
    want: { verify: true },
  }
}

/** Lengths of all lists of numbers in a result but those of its own history. */
function lengths(value: unknown, path = ''): [string, number][] {
  if (Array.isArray(value) && typeof value[0] === 'number') return [[path, value.length]]
  if (typeof value !== 'object' || value === null) return []
  return Object.entries(value).flatMap(([key, one]): [string, number][] => {
    if (key === 'at') return []
    if (key === 'band') return [[`${path}.band`, one.length]]
    return lengths(one, `${path}.${key}`)
  })
}

describe('A result in time', () => {
  const { result } = solveModel(
    falling({ kind: 'transient', initialHead: 'steady', stages: [{ duration: 2 }, { duration: 0.5 }] }),
  )

  it('is read at its last time, or at another, as a steady one would be', () => {
    const last = resultAt(result)
    for (const [path, length] of lengths({ ...last, balance: { ...last.balance, volumes: null } })) {
      expect([path, length]).toEqual([path, 1])
    }
    expect(lengths(last).map(([path]) => path)).toContain('.verification.results.0.band')
    expect(last.points[0]?.band).toEqual([result.points[0]?.band?.[1]])
    expect(last.points[0]?.head).toEqual([result.points[0]?.head[1]])
    expect(resultAt(result, 0).points[0]?.head).toEqual([result.points[0]?.head[0]])
    expect(resultAt(result, 0).balance.inflow).toEqual([result.balance.inflow[0]])
    expect(last.balance.volumes).toEqual(result.balance.volumes)
    expect([momentInWords(last, 'd'), momentInWords(resultAt(result, 0), 'd')]).toEqual([
      ' at 2.5 d',
      ' at 2 d',
    ])
  })

  it('balances once what the ground gives from storage, or takes into it, is counted', () => {
    for (const moment of [resultAt(result, 0), resultAt(result)]) {
      const { inflow, outflow } = totalFlow(moment)
      expect((inflow[0] ?? 0) / (outflow[0] ?? 1)).toBeCloseTo(1, 6)
    }
    // The river falls in the second stage: the ground drains.
    expect(storageFlow(resultAt(result))[0]?.inflow[0]).toBeGreaterThan(0)
  })

  it('is left as it is when it is steady', () => {
    const steady = solveModel(falling({ kind: 'steady' })).result
    expect(resultAt(steady)).toBe(steady)
    expect(storageFlow(steady)).toEqual([])
    expect(totalFlow(steady)).toMatchObject({ inflow: steady.balance.inflow })
    expect(momentInWords(steady, 'd')).toBe('')
  })
})
