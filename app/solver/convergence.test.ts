import { describe, expect, it } from 'vitest'
import { gridError } from './convergence'
import { gridChoice, onGrid } from './grid-variants'
import type { Model } from './model'

/** Values a + c h^p on cells of these sizes. */
function values(a: number, c: number, p: number, sizes: number[]): number[] {
  return sizes.map((h) => a + c * h ** p)
}

describe('the error of a value by three grids', () => {
  it.each([
    [[1, 2, 4], 2],
    [[1, 2, 4], 1],
    [[1, 1.9, 4.2], 1.5],
    [[0.5, 1, 1.7], 0.7],
  ])(
    'cells of %j and order %d: the order is found, the limit extrapolated, the error 1.25 times the true one',
    (sizes, p) => {
      for (const own of [0, 1, 2]) {
        const found = gridError(values(10, -0.3, p, sizes), sizes, own)
        const true0 = 0.3 * (sizes[own] as number) ** p
        expect(found.how).toBe('observed order')
        expect(found.order).toBeCloseTo(p, 8)
        expect(found.extrapolated).toBeCloseTo(10, 8)
        expect(found.error).toBeCloseTo(1.25 * true0, 8)
      }
    },
  )

  it('an order above 2 counts as 2, with the larger of what the two pairs make of it', () => {
    const found = gridError([10.001, 10.002, 10.042], [1, 2, 4], 1)
    expect(found.how).toBe('limited order')
    // The coarse pair: 0.04 / (16 - 4) a unit, times 2^2.
    expect(found.error).toBeCloseTo((1.25 * 0.04 * 4) / 12, 10)
  })

  it('values that swing, or grow apart as cells shrink, are taken at first order with a factor of 3', () => {
    const swinging = gridError([10, 10.01, 9.99], [1, 2, 4], 1)
    expect(swinging).toMatchObject({ how: 'first order assumed', extrapolated: null })
    expect(swinging.error).toBeCloseTo(3 * 0.01 * 2, 10)
    expect(gridError([10, 10.2, 10.3], [1, 2, 4], 0).how).toBe('first order assumed')
  })

  it('two grids alone are taken at first order; one says nothing', () => {
    expect(gridError([10, 10.02], [1, 2], 0).error).toBeCloseTo(3 * 0.02, 12)
    expect(gridError([10], [1], 0).how).toBe('none')
  })

  it('values that are the same on all grids have no error', () => {
    expect(gridError([10, 10, 10], [1, 2, 4], 1).error).toBe(0)
  })
})

describe('grids beside the model’s own', () => {
  it('one finer and one coarser; only coarser ones at the limit of cells, only finer ones of a small grid', () => {
    expect(gridChoice(10_000, 100, 100, 1e6).times).toEqual([0.5, 1, 2])
    expect(gridChoice(640_000, 800, 800, 1e6).times).toEqual([1, 2, 4])
    expect(gridChoice(25, 5, 5, 1e6).times).toEqual([0.25, 0.5, 1])
    expect(gridChoice(25, 5, 5, 200).times).toEqual([0.5, 1])
    expect(gridChoice(25, 5, 5, 50)).toEqual({
      times: [1],
      why: 'a finer grid would have more than 50 cells, a coarser one too few',
    })
    expect(gridChoice(100, 100, 1, 1e6).times).toEqual([0.5, 1, 2])
  })

  it('count cells, halve and join given edges, and scale planned sizes', () => {
    const on = (grid: Model['grid'], times: number) => onGrid({ grid } as Model, times).grid
    expect(on({ columns: 15, rows: 1 }, 0.5)).toEqual({ columns: 30, rows: 2 })
    expect(on({ columns: 15, rows: 1 }, 2)).toEqual({ columns: 8, rows: 1 })
    expect(on({ xEdges: [0, 1, 3, 7], yEdges: [0, 4] }, 0.5)).toEqual({
      xEdges: [0, 0.5, 1, 2, 3, 5, 7],
      yEdges: [0, 2, 4],
    })
    expect(on({ xEdges: [0, 1, 3, 7], yEdges: [0, 4] }, 2)).toEqual({ xEdges: [0, 3, 7], yEdges: [0, 4] })
    expect(on({ cellSize: 2, refine: [{ x: 1, y: 1, cellSize: 0.5 }] }, 0.5)).toEqual({
      cellSize: 1,
      refine: [{ x: 1, y: 1, cellSize: 0.25 }],
    })
  })
})
