import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { largestCellCount } from './grid'
import type { Model, PlannedGrid, Position } from './model'
import { largestGrowth, plannedGrid } from './planned-grid'
import type { Warning } from './result'

function modelWith(grid: PlannedGrid, changes: Partial<Model> = {}): Model {
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'plan',
    flow: 'confined',
    extent: { x: [0, 1000], y: [-200, 400] },
    grid,
    time: { kind: 'steady' },
    materials: [{ name: 'Sand', kx: 1, ky: 1 }],
    ground: [{ material: 'Sand', base: 0, top: 10 }],
    ...changes,
  }
}

function planned(grid: PlannedGrid, changes: Partial<Model> = {}) {
  const warnings: Warning[] = []
  const { xEdges, yEdges, columns, rows } = plannedGrid(modelWith(grid, changes), grid, warnings)
  return { xEdges: [...xEdges], yEdges: [...yEdges], columns, rows, warnings }
}

function widths(edges: number[]): number[] {
  return edges.slice(1).map((edge, k) => edge - (edges[k] as number))
}

function worstGrowth(edges: number[]): number {
  const sizes = widths(edges)
  return sizes.reduce((worst, size, k) => {
    const before = k > 0 ? (sizes[k - 1] as number) : size
    return Math.max(worst, size / before, before / size)
  }, 1)
}

const place = fc.record({
  x: fc.double({ min: 0, max: 1000, noNaN: true }),
  y: fc.double({ min: -200, max: 400, noNaN: true }),
})
const refine = fc.record({
  x: fc.double({ min: 0, max: 1000, noNaN: true }),
  y: fc.double({ min: -200, max: 400, noNaN: true }),
  cellSize: fc.double({ min: -2, max: 2, noNaN: true }).map((power) => 10 ** power),
})

describe('a planned grid', () => {
  it('without refinement is even, with cells no larger than asked for', () => {
    const even = planned({ cellSize: 5 })
    expect([even.columns, even.rows]).toEqual([200, 120])
    for (const width of widths(even.xEdges)) expect(Math.abs(width - 5)).toBeLessThan(1e-9)
    const odd = planned({ cellSize: 7 })
    expect([odd.columns, odd.rows]).toEqual([143, 86])
    expect(Math.max(...widths(odd.xEdges))).toBeLessThanOrEqual(7)
  })

  it('rises, grows by at most 1.3, keeps the sizes asked for and has edges at every feature or says what it merged', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 4, max: 300, noNaN: true }),
        fc.array(refine, { maxLength: 4 }),
        fc.array(fc.tuple(place, place), { maxLength: 4 }),
        fc.array(place, { maxLength: 3 }),
        (cellSize, points, walls, corners) => {
          const grid = { cellSize, refine: points }
          const changes: Partial<Model> = {
            walls: walls.map(([a, b], k) => ({
              name: `${k}`,
              line: [
                [a.x, a.y],
                [b.x, b.y],
              ],
              thickness: 1,
              k: 0,
            })),
            ground: [
              { material: 'Sand', base: 0, top: 10 },
              ...corners.map(({ x, y }, k) => ({
                material: 'Sand',
                base: k,
                top: 20,
                polygon: [
                  [0, -200],
                  [x, -200],
                  [x, y],
                  [0, y],
                ] as Position[],
              })),
            ],
          }
          fc.pre(corners.every(({ x, y }) => x > 1 && y > -199))
          const result = planned(grid, changes)
          const again = planned(grid, changes)
          expect(again).toEqual(result)
          for (const [edges, axis] of [
            [result.xEdges, 'x'],
            [result.yEdges, 'y'],
          ] as const) {
            const sizes = widths(edges)
            expect(Math.min(...sizes)).toBeGreaterThan(0)
            expect(Math.max(...sizes)).toBeLessThanOrEqual(cellSize * (1 + 1e-6))
            expect(worstGrowth(edges)).toBeLessThanOrEqual(largestGrowth)
            expect(edges[0]).toBe(axis === 'x' ? 0 : -200)
            expect(edges.at(-1)).toBe(axis === 'x' ? 1000 : 400)
            const features = [...points, ...walls.flat(), ...corners].map((feature) => feature[axis])
            for (const feature of features) {
              const off = Math.min(...edges.map((edge) => Math.abs(edge - feature)))
              // Edges moved onto another one, by at most a tenth of the cells there.
              if (off > 1e-5 * cellSize) expect(result.warnings.length).toBeGreaterThan(0)
              expect(off).toBeLessThanOrEqual(0.1 * cellSize)
            }
            for (const point of points) {
              // A refine point may have moved onto another one; its size stays at that edge.
              const nearest = edges.reduce((best, edge) =>
                Math.abs(edge - point[axis]) < Math.abs(best - point[axis]) ? edge : best,
              )
              const k = edges.indexOf(nearest)
              for (const size of [sizes[k - 1], sizes[k]]) {
                if (size !== undefined) expect(size).toBeLessThanOrEqual(point.cellSize * (1 + 1e-6))
              }
            }
          }
        },
      ),
      { numRuns: 60 },
    )
  })

  it('takes as few cells as the growth allows: one refine point costs two geometric rows', () => {
    const { xEdges } = planned({ cellSize: 50, refine: [{ x: 500, y: 0, cellSize: 0.5 }] })
    let cells = 0
    let length = 0
    for (let size = 0.5; length < 500; size = Math.min(50, size * largestGrowth)) {
      length += size
      cells++
    }
    expect(xEdges.length - 1).toBe(2 * cells)
  })

  it('is the same from both ends when the model is', () => {
    const { xEdges } = planned({
      cellSize: 40,
      refine: [
        { x: 300, y: 0, cellSize: 1 },
        { x: 700, y: 0, cellSize: 1 },
      ],
    })
    const sizes = widths(xEdges)
    sizes.forEach((size, k) => {
      expect(Math.abs(size - (sizes.at(-1 - k) as number))).toBeLessThan(1e-6 * size)
    })
  })

  it('follows the corners of a hole and the interfaces of materials, not those hidden under later ground', () => {
    const rectangle = (x0: number, y0: number, x1: number, y1: number): Position[] => [
      [x0, y0],
      [x1, y0],
      [x1, y1],
      [x0, y1],
    ]
    const { xEdges, yEdges } = planned(
      { cellSize: 100 },
      {
        ground: [
          { material: 'Sand', base: 0, top: 10, polygon: rectangle(0, -200, 333, 400) },
          { material: 'Sand', base: 0, top: 10, polygon: rectangle(333, -200, 1000, 123) },
          { material: 'Sand', base: 0, top: 8, polygon: rectangle(700, -200, 1000, 50) },
          { material: 'Sand', base: 0, top: 8, polygon: rectangle(650, -200, 1000, 50) },
        ],
      },
    )
    expect(xEdges).toContain(333)
    expect(xEdges).toContain(650)
    expect(xEdges).not.toContain(700)
    expect(yEdges).toContain(123)
    expect(yEdges).toContain(50)
  })

  it('does not follow every vertex of a curve', () => {
    const circle = Array.from({ length: 360 }, (_, k): Position => {
      const angle = (k * 2 * Math.PI) / 360
      return [500 + 150 * Math.cos(angle), 100 + 150 * Math.sin(angle)]
    })
    const { columns } = planned(
      { cellSize: 10 },
      { ground: [{ material: 'Sand', base: 0, top: 10, polygon: circle }] },
    )
    expect(columns).toBe(100)
  })

  it('names what it merges', () => {
    const { warnings, xEdges } = planned(
      { cellSize: 20, refine: [{ x: 500, y: 0, cellSize: 20 }] },
      {
        walls: [
          {
            name: 'Cut-off',
            line: [
              [501, 0],
              [501, 300],
            ],
            thickness: 1,
            k: 0,
          },
        ],
      },
    )
    expect(xEdges).toContain(500)
    expect(xEdges).not.toContain(501)
    expect(warnings[0]?.code).toBe('edges-merged')
    expect(warnings[0]?.text).toContain('Cut-off')
  })

  it('refuses what makes no grid, and too many cells before taking memory for them', () => {
    expect(() => planned({ cellSize: 0 })).toThrow('greater than zero')
    expect(() => planned({ cellSize: 5, refine: [{ x: 2000, y: 0, cellSize: 1 }] })).toThrow(
      'outside the extent',
    )
    expect(() => planned({ cellSize: 5, refine: [{ x: 20, y: 0, cellSize: -1 }] })).toThrow(
      'greater than zero',
    )
    expect(() => planned({ cellSize: 1e-3 })).toThrow(`${largestCellCount}`)
    expect(() => planned({ cellSize: 1e-9 })).toThrow(`${largestCellCount}`)
  })
})
