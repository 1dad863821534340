import { describe, expect, test } from 'vitest'
import type { Model } from '~/solver/model'
import { cutChart, cutThrough } from './cut'
import { featuresOf, groundAt } from './features'
import type { HeadField } from './field'

/** h = 3 + 0.5 x - 0.25 y on cells of different sizes. */
function plane(): HeadField {
  const xEdges = Float64Array.of(0, 2, 3, 7, 10)
  const yEdges = Float64Array.of(0, 4, 5, 10)
  const heads = Float64Array.from({ length: 12 }, (_, cell) => {
    const i = cell % 4
    const j = Math.floor(cell / 4)
    const x = ((xEdges[i] as number) + (xEdges[i + 1] as number)) / 2
    const y = ((yEdges[j] as number) + (yEdges[j + 1] as number)) / 2
    return 3 + 0.5 * x - 0.25 * y
  })
  return { xEdges, yEdges, heads }
}

const model: Model = {
  format: 'lavant-model',
  version: 1,
  units: { length: 'm', time: 'd' },
  kind: 'plan',
  flow: 'confined',
  extent: { x: [0, 10], y: [0, 10] },
  grid: { columns: 4, rows: 3 },
  time: { kind: 'steady' },
  materials: [{ name: 'Sand', kx: 10, ky: 10 }],
  ground: [
    { material: 'Sand', base: -12, top: -2 },
    {
      polygon: [
        [5, 0],
        [10, 0],
        [10, 10],
        [5, 10],
      ],
      layers: [
        { material: 'Sand', base: -4, top: 1 },
        { material: 'Sand', base: -9, top: -4 },
      ],
    },
  ],
  wells: [{ name: 'W1', x: 2, y: 2, kind: 'abstraction', rate: 5 }],
  recharge: [{ name: 'Rain', rate: 0.001 }],
  points: [{ name: 'P1', x: 3, y: 3 }],
}

describe('a cut through the heads', () => {
  test('of a plane is a straight line, with distances measured from A', () => {
    const samples = cutThrough(plane(), [1, 1], [9, 7], 11)
    expect(samples).toHaveLength(11)
    expect(samples[0]).toMatchObject({ distance: 0, x: 1, y: 1 })
    expect(samples.at(-1)?.distance).toBeCloseTo(10, 12)
    for (const { x, y, head } of samples) expect(head).toBeCloseTo(3 + 0.5 * x - 0.25 * y, 9)
  })

  test('has no head beyond the extent', () => {
    const samples = cutThrough(plane(), [-5, 5], [15, 5], 5)
    expect(samples.map(({ head }) => Number.isNaN(head))).toEqual([true, false, false, false, true])
  })

  test('is charted with a gap where there is no head, and says what levels are measured from', () => {
    const option = cutChart(
      [
        {
          name: 'Head',
          look: 'head',
          samples: [
            { distance: 0, level: 1 },
            { distance: 5, level: null },
          ],
        },
      ],
      { unit: 'm', datum: 'm above site datum', theme: 'print' },
    )
    expect(option.series).toMatchObject([
      {
        data: [
          [0, 1],
          [5, null],
        ],
      },
    ])
    expect(option.yAxis).toMatchObject({ name: 'Level, m above site datum' })
  })
})

describe('what a run was computed from', () => {
  test('is drawn from its frozen model file', () => {
    const features = featuresOf(model, ['north'])
    expect(features.wells).toEqual([{ name: 'W1', x: 2, y: 2, kind: 'abstraction' }])
    expect(features.rechargeZones).toEqual([{ name: 'Rain', polygon: null }])
    expect(features.noFlowEdges).toEqual(['north'])
  })

  test('has the ground of the last entry that covers a place, from the top of its layers to their base', () => {
    expect(groundAt(model, 1, 1)).toEqual({ base: -12, top: -2 })
    expect(groundAt(model, 8, 1)).toEqual({ base: -9, top: 1 })
  })
})
