import { describe, expect, it } from 'vitest'
import type { Row } from '~/book/row'
import { boundaryFeatures, rechargeZoneFeatures, wellFeatures, withBoundaryGeometry } from './drawn-features'
import type { Boundary, RechargeZone, Well } from './water'

function row<Body>(id: string, kind: string, body: Body): Row<Body> {
  return { id, version: 1, kind, position: 0, body, recordedFrom: '2026-01-01T00:00:00Z', recordedBy: 'A' }
}

const river: Boundary = {
  name: 'River',
  kind: 'fixed head',
  line: [
    [0, 0],
    [100, 0],
    [200, 0],
  ],
  levels: [
    { value: 2, unit: 'm' },
    { value: 1, unit: 'm' },
    { value: 0.4, unit: 'm' },
  ],
  flux: null,
  direction: 'into the model',
  conductance: null,
  disconnectsBelow: null,
  outer: false,
  source: '',
}

describe('rows of the water section on the drawing', () => {
  it('carry the words that tell a recharge well and a kind of boundary', () => {
    const well: Well = {
      name: 'W9',
      x: 3,
      y: 4,
      kind: 'recharge',
      rate: { value: 10, unit: 'm3/d' },
      radius: null,
      lowestLevel: null,
      screenTop: null,
      screenBottom: null,
      source: '',
    }
    expect(wellFeatures([row('a', 'well', well)])[0]).toEqual({
      id: 'a',
      kind: 'well',
      label: 'W9 recharge',
      geometry: { type: 'point', at: [3, 4] },
      detail: { wellKind: 'recharge' },
    })
    expect(boundaryFeatures([row('b', 'boundary', river)])[0]?.label).toBe('River, fixed head')
  })

  it('leave out recharge that falls everywhere', () => {
    const rain: RechargeZone = {
      name: 'Rain',
      polygon: null,
      rate: { value: 250, unit: 'mm/a' },
      source: '',
    }
    expect(rechargeZoneFeatures([row('c', 'recharge zone', rain)])).toEqual([])
  })
})

describe('a boundary with a level at each vertex', () => {
  it('keeps its levels when a vertex is dragged', () => {
    const dragged = withBoundaryGeometry(river, {
      type: 'line',
      vertices: [
        [0, 0],
        [100, 40],
        [200, 0],
      ],
    })
    expect(dragged.levels).toEqual(river.levels)
  })

  it('gets a level between its neighbours where a vertex is put in', () => {
    const longer = withBoundaryGeometry(river, {
      type: 'line',
      vertices: [
        [0, 0],
        [50, 0],
        [100, 0],
        [200, 0],
      ],
    })
    expect(longer.levels).toEqual([
      { value: 2, unit: 'm' },
      { value: 1.5, unit: 'm' },
      { value: 1, unit: 'm' },
      { value: 0.4, unit: 'm' },
    ])
  })

  it('loses the level of a vertex that is taken out, and no other', () => {
    const shorter = withBoundaryGeometry(river, {
      type: 'line',
      vertices: [
        [0, 0],
        [200, 0],
      ],
    })
    expect(shorter.levels).toEqual([river.levels?.[0], river.levels?.[2]])
  })
})
