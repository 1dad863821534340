import fc from 'fast-check'
import { Matrix, solve } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { discretise } from '~/solver/discretise'
import { emptyMatrix, evaluate, flowModelOf } from '~/solver/flow'
import type { Boundary, Model, Position } from '~/solver/model'
import { solveModel } from '~/solver/solve'
import { east, planModel, west } from './plan-model'

/** Edges from 0 to 100 whose cells differ in width by factors of up to five. */
const unevenEdges = fc
  .array(fc.double({ min: 1, max: 5, noNaN: true }), { minLength: 2, maxLength: 9 })
  .map((widths) => {
    const whole = widths.reduce((sum, width) => sum + width, 0)
    let at = 0
    return [0, ...widths.slice(0, -1).map((width) => (at += (100 * width) / whole)), 100]
  })
const angle = fc.double({ min: 3, max: 177, noNaN: true }).filter((degrees) => Math.abs(degrees - 90) > 3)
const anisotropy = fc.double({ min: -2, max: 2, noNaN: true }).map((power) => 10 ** power)

/** All sides held at a head that is linear in x and y. */
function heldLinear(gx: number, gy: number): Boundary {
  const line: Position[] = [
    [0, 0],
    [100, 0],
    [100, 100],
    [0, 100],
    [0, 0],
  ]
  return { name: 'Round', kind: 'fixed head', line, head: line.map(([x, y]) => 20 + gx * x + gy * y) }
}

function anyModel(changes: Partial<Model>): Model {
  return planModel({ solver: { tolerance: 1e-13 }, ...changes })
}

describe('principal directions oblique to the grid', () => {
  it('linear heads are exact in even ground on any grid, at the cells, at points and through every face', () => {
    fc.assert(
      fc.property(
        unevenEdges,
        unevenEdges,
        angle,
        anisotropy,
        fc.double({ min: -0.05, max: 0.05, noNaN: true }),
        fc.array(
          fc.tuple(
            fc.double({ min: 0, max: 100, noNaN: true }),
            fc.double({ min: 0, max: 100, noNaN: true }),
          ),
          {
            minLength: 1,
            maxLength: 4,
          },
        ),
        (xEdges, yEdges, degrees, ky, gx, places) => {
          const gy = 0.03
          const model = anyModel({
            grid: { xEdges, yEdges },
            materials: [{ name: 'Sand', kx: 1, ky, angle: degrees }],
            boundaries: [heldLinear(gx, gy)],
            points: places.map(([x, y], k) => ({ name: `${k}`, x, y })),
          })
          const { result, heads, grid } = solveModel(model)
          expect(result.converged).toBe(true)
          for (let j = 0; j < grid.rows; j++) {
            for (let i = 0; i < grid.columns; i++) {
              const x = ((xEdges[i] as number) + (xEdges[i + 1] as number)) / 2
              const y = ((yEdges[j] as number) + (yEdges[j + 1] as number)) / 2
              expect(Math.abs((heads[j * grid.columns + i] as number) - (20 + gx * x + gy * y))).toBeLessThan(
                1e-8,
              )
            }
          }
          places.forEach(([x, y], k) => {
            expect(Math.abs((result.points[k]?.head[0] as number) - (20 + gx * x + gy * y))).toBeLessThan(
              1e-7,
            )
          })
        },
      ),
      { numRuns: 40 },
    )
  })

  it('beside an interface along the grid, heads linear on both sides are exact', () => {
    // Flow across the interface at x = 40 is the same on both sides, the gradient along it too.
    const tensors = [
      { kx: 8, ky: 1, angle: 35 },
      { kx: 0.5, ky: 3, angle: -20 },
    ].map(({ kx, ky, angle: degrees }) => {
      const [c, s] = [Math.cos((degrees * Math.PI) / 180), Math.sin((degrees * Math.PI) / 180)]
      return { xx: kx * c * c + ky * s * s, xy: (kx - ky) * s * c }
    }) as [{ xx: number; xy: number }, { xx: number; xy: number }]
    const gy = 0.02
    const gx0 = 0.05
    const gx1 = (tensors[0].xx * gx0 + (tensors[0].xy - tensors[1].xy) * gy) / tensors[1].xx
    const exact = (x: number, y: number) => 20 + gy * y + (x < 40 ? gx0 * x : gx0 * 40 + gx1 * (x - 40))
    const line: Position[] = [
      [0, 0],
      [40, 0],
      [100, 0],
      [100, 100],
      [40, 100],
      [0, 100],
      [0, 0],
    ]
    const { heads, grid } = solveModel(
      anyModel({
        grid: { xEdges: [0, 7, 15, 30, 40, 42, 60, 75, 100], yEdges: [0, 20, 25, 50, 70, 100] },
        materials: [
          { name: 'Sand', kx: 8, ky: 1, angle: 35 },
          { name: 'Chalk', kx: 0.5, ky: 3, angle: -20 },
        ],
        ground: [
          { material: 'Sand', base: 0, top: 10 },
          {
            material: 'Chalk',
            polygon: [
              [40, 0],
              [100, 0],
              [100, 100],
              [40, 100],
            ],
            base: 0,
            top: 10,
          },
        ],
        boundaries: [{ name: 'Round', kind: 'fixed head', line, head: line.map(([x, y]) => exact(x, y)) }],
      }),
    )
    for (let j = 0; j < grid.rows; j++) {
      for (let i = 0; i < grid.columns; i++) {
        const x = ((grid.xEdges[i] as number) + (grid.xEdges[i + 1] as number)) / 2
        const y = ((grid.yEdges[j] as number) + (grid.yEdges[j + 1] as number)) / 2
        expect(Math.abs((heads[j * grid.columns + i] as number) - exact(x, y))).toBeLessThan(1e-8)
      }
    }
  })

  const disturbed = fc
    .record({
      xEdges: unevenEdges,
      yEdges: unevenEdges,
      degrees: angle,
      ky: anisotropy,
      lens: anisotropy,
      corner: fc.tuple(
        fc.double({ min: 20, max: 80, noNaN: true }),
        fc.double({ min: 20, max: 80, noNaN: true }),
      ),
      wallK: fc.constantFrom(0, 1e-3, 0.1),
      unconfined: fc.boolean(),
    })
    // Ground that is the same in all directions has none askew.
    .filter(({ ky, lens }) => Math.abs(Math.log(ky)) > 0.1 && Math.abs(Math.log(lens)) > 0.1)
    .map(({ xEdges, yEdges, degrees, ky, lens, corner: [x, y], wallK, unconfined }) =>
      anyModel({
        flow: unconfined ? 'unconfined' : 'confined',
        grid: { xEdges, yEdges },
        materials: [
          { name: 'Sand', kx: 1, ky, angle: degrees },
          { name: 'Lens', kx: 2, ky: 2 * lens, angle: 20 - degrees },
        ],
        ground: [
          { material: 'Sand', base: 0, top: 10 },
          {
            material: 'Lens',
            polygon: [
              [0, 0],
              [x, 0],
              [x, y],
              [0, y],
            ],
            base: -2,
            top: 9,
          },
        ],
        recharge: [{ name: 'Rain', rate: 1e-3 }],
        wells: [{ name: 'W', x: 70, y: 31, kind: 'abstraction', rate: 1 }],
        walls: [
          {
            name: 'Wall',
            line: [
              [50, 25],
              [50, 100],
            ],
            thickness: 1,
            k: wallK,
          },
        ],
        boundaries: [
          west(12),
          east(11),
          {
            name: 'Valley side',
            kind: 'specified flux',
            line: [
              [20, 100],
              [80, 100],
            ],
            flux: 0.01,
          },
        ],
        rings: [
          {
            name: 'Ring',
            polygon: [
              [10, 10],
              [90, 10],
              [90, 90],
              [10, 90],
            ],
          },
          {
            name: 'West half',
            polygon: [
              [0, 0],
              [60, 0],
              [60, 100],
              [0, 100],
            ],
          },
        ],
        solver: { tolerance: 1e-11 },
      }),
    )

  it('every cell and every ring balances, with jumps, walls, fluxes and a well, confined and unconfined', () => {
    fc.assert(
      fc.property(disturbed, (model) => {
        const { result } = solveModel(model)
        expect(result.converged).toBe(true)
        expect(Math.abs(result.balance.errorPercent[0] as number)).toBeLessThan(1e-6)
        for (const ring of result.rings) {
          const size = Math.abs(ring.recharge[0] as number) + Math.abs(ring.wells[0] as number) + 1
          expect(Math.abs(ring.error[0] as number)).toBeLessThan(1e-7 * size)
        }
      }),
      { numRuns: 40 },
    )
  })

  it('the matrix is symmetric positive definite, however uneven the grid and strong the anisotropy', () => {
    fc.assert(
      fc.property(
        disturbed.filter((model) => model.flow === 'confined'),
        fc.constantFrom(1, 10),
        (model, stronger) => {
          const materials = model.materials.map((material) => ({ ...material, ky: material.ky * stronger }))
          const full = fullMatrix({ ...model, materials })
          const count = full.rows
          for (let a = 0; a < count; a++) {
            for (let b = 0; b < a; b++) {
              expect(Math.abs(full.get(a, b) - full.get(b, a))).toBeLessThan(1e-12 * full.get(a, a))
            }
          }
          expect(leastPivot(full)).toBeGreaterThan(0)
        },
      ),
      { numRuns: 40 },
    )
  })

  it('relaxation, multigrid and a direct solve of the same balance agree to 1e-9 of the range', () => {
    fc.assert(
      fc.property(
        disturbed.filter((model) => model.flow === 'confined'),
        (model) => {
          const direct = directHeads(model)
          for (const method of ['sor', 'multigrid'] as const) {
            const { heads, result } = solveModel({ ...model, solver: { method, tolerance: 1e-13 } })
            expect(result.converged).toBe(true)
            const range = Math.max(...heads) - Math.min(...heads)
            direct.forEach((head, cell) => {
              expect(Math.abs((heads[cell] as number) - head) / range).toBeLessThan(1e-9)
            })
          }
        },
      ),
      { numRuns: 25 },
    )
  })

  it('a quarter turn of the ground is the same as its conductivities exchanged, a mirror as the angle reversed', () => {
    const model = (degrees: number, kx: number, ky: number) =>
      solveModel(
        anyModel({
          grid: { columns: 9, rows: 9 },
          materials: [{ name: 'Sand', kx, ky, angle: degrees }],
          wells: [{ name: 'W', x: 50, y: 50, kind: 'abstraction', rate: 5 }],
        }),
      ).heads
    const [one, turned, mirrored] = [model(30, 5, 1), model(120, 1, 5), model(-30, 5, 1)]
    one.forEach((head, cell) => {
      const j = Math.floor(cell / 9)
      expect(Math.abs(head - (turned[cell] as number))).toBeLessThan(1e-9)
      expect(Math.abs(head - (mirrored[(8 - j) * 9 + (cell - j * 9)] as number))).toBeLessThan(1e-9)
    })
  })

  it('a wall without end that lets nothing through keeps its sides apart', () => {
    const { result } = solveModel(
      anyModel({
        grid: { columns: 10, rows: 10 },
        materials: [{ name: 'Sand', kx: 10, ky: 1, angle: 30 }],
        walls: [
          {
            name: 'Wall',
            line: [
              [50, 0],
              [50, 100],
            ],
            thickness: 1,
            k: 0,
          },
        ],
        lines: [
          {
            name: 'Through the wall',
            line: [
              [50, 0],
              [50, 100],
            ],
          },
        ],
      }),
    )
    expect(Math.abs(result.lines[0]?.discharge[0] as number)).toBeLessThan(1e-9)
  })
})

interface System {
  full: Matrix
  right: Matrix
  start: Float64Array
  reference: number
  active: Uint8Array
}

function systemOf(model: Model): System {
  const d = discretise(model)
  const flow = flowModelOf(d)
  const { columns, rows } = d.grid
  const count = columns * rows
  const state = { imbalance: new Float64Array(count), forcing: new Float64Array(count) }
  const matrix = emptyMatrix(flow)
  const start = new Float64Array(count)
  evaluate(
    flow,
    start,
    d.wells.map((well) => well.requested),
    state,
    matrix,
  )
  const full = Matrix.zeros(count, count)
  const right = Matrix.zeros(count, 1)
  const corners = matrix.corners as NonNullable<typeof matrix.corners>
  for (let c = 0; c < count; c++) {
    const j = Math.floor(c / columns)
    const i = c - j * columns
    full.set(c, c, matrix.diag[c] as number)
    right.set(c, 0, state.imbalance[c] as number)
    for (const [column, row, link] of [
      [-1, 0, matrix.west],
      [1, 0, matrix.east],
      [0, -1, matrix.south],
      [0, 1, matrix.north],
      [-1, -1, corners.southWest],
      [1, -1, corners.southEast],
      [-1, 1, corners.northWest],
      [1, 1, corners.northEast],
    ] as const) {
      if (i + column < 0 || i + column >= columns || j + row < 0 || j + row >= rows) continue
      full.set(c, c + row * columns + column, -(link[c] as number))
    }
  }
  return { full, right, start, reference: d.reference, active: d.active }
}

function fullMatrix(model: Model): Matrix {
  return systemOf(model).full
}

function directHeads(model: Model): number[] {
  const { full, right, start, reference } = systemOf(model)
  return solve(full, right)
    .to1DArray()
    .map((change, c) => (start[c] as number) + change + reference)
}

/** The least pivot of Cholesky's factorisation without roots: positive if and only if the matrix is. */
function leastPivot(full: Matrix): number {
  const a = full.clone()
  let least = Number.POSITIVE_INFINITY
  for (let k = 0; k < a.rows; k++) {
    least = Math.min(least, a.get(k, k))
    for (let i = k + 1; i < a.rows; i++) {
      const factor = a.get(i, k) / a.get(k, k)
      for (let j = k; j < a.rows; j++) a.set(i, j, a.get(i, j) - factor * a.get(k, j))
    }
  }
  return least
}
