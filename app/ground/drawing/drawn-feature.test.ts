import { describe, expect, it } from 'vitest'
import {
  decimalsAt,
  extentAbout,
  geometryProblem,
  hatchStrokes,
  movedVertices,
  roundedVertices,
  roundLength,
} from './drawn-feature'

describe('positions picked by hand', () => {
  it('get the decimals that a pixel can tell apart', () => {
    expect(decimalsAt(2)).toBe(0)
    expect(decimalsAt(0.8)).toBe(1)
    expect(decimalsAt(0.02)).toBe(2)
    expect(decimalsAt(0.00001)).toBe(3)
  })

  it('are rounded, except where they lie on a vertex that is already known', () => {
    const vertices = roundedVertices(
      [
        [482545.2512, 105370.123],
        [482600.0372, 105300.961],
      ],
      1,
      [[482545.2512, 105370.123]],
    )
    expect(vertices).toEqual([
      [482545.2512, 105370.123],
      [482600, 105301],
    ])
  })

  it('keep the form of what is moved', () => {
    const before: [number, number][] = [
      [0.123, 0],
      [10.456, 7.25],
    ]
    const after: [number, number][] = [
      [5.1634, -2.04],
      [15.4964, 5.21],
    ]
    expect(movedVertices(before, after, 1)).toEqual([
      [5.123, -2],
      [15.456, 5.25],
    ])
  })
})

describe('a drawn shape', () => {
  it('is refused with the reason when its edges cross', () => {
    const bow: [number, number][] = [
      [0, 0],
      [10, 10],
      [10, 0],
      [0, 14],
    ]
    expect(geometryProblem({ type: 'polygon', vertices: bow })).toMatch('cross')
    expect(geometryProblem({ type: 'line', vertices: bow })).toBeNull()
    expect(geometryProblem({ type: 'line', vertices: [[0, 0]] })).toMatch('two vertices')
  })

  it('counts with all its vertices in the extent of a drawing', () => {
    expect(extentAbout([])).toBeNull()
    expect(
      extentAbout([
        { type: 'point', at: [5, 50] },
        {
          type: 'line',
          vertices: [
            [-3, 2],
            [9, 4],
          ],
        },
      ]),
    ).toEqual([-3, 2, 9, 50])
  })
})

describe('the furniture of a drawing', () => {
  it('has a scale bar of a round length', () => {
    expect(roundLength(137)).toBe(100)
    expect(roundLength(50)).toBe(50)
    expect(roundLength(0.43)).toBeCloseTo(0.2, 12)
  })

  it('hatches a wall evenly round its corners, and never without end', () => {
    const strokes = hatchStrokes(
      [
        [0, 0],
        [10, 0],
        [10, 10],
      ],
      4,
      1,
    )
    expect(strokes.map(([a, b]) => [(a[0] + b[0]) / 2, (a[1] + b[1]) / 2])).toEqual([
      [2, 0],
      [6, 0],
      [10, 0],
      [10, 4],
      [10, 8],
    ])
    expect(
      hatchStrokes(
        [
          [0, 0],
          [1e6, 0],
        ],
        0.001,
        1,
        200,
      ).length,
    ).toBeLessThanOrEqual(200)
  })
})
