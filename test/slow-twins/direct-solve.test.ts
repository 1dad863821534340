import fc from 'fast-check'
import { Matrix, solve } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { solverKernels } from '~/heads/kernels.server'
import { discretise } from '~/solver/discretise'
import { emptyMatrix, evaluate, flowModelOf } from '~/solver/flow'
import type { Model } from '~/solver/model'
import { ModelError } from '~/solver/model-error'
import { solveModel } from '~/solver/solve'
import { planModel } from './plan-model'

/** The system of a linear model written out in full and solved by a general-purpose library. */
function directHeads(model: Model): number[] {
  const d = discretise(model)
  const flow = flowModelOf(d)
  expect(flow.linear).toBe(true)
  const count = d.active.length
  const { columns, rows } = d.grid
  const state = { imbalance: new Float64Array(count), forcing: new Float64Array(count) }
  const matrix = emptyMatrix(flow)
  const start = d.fixedHead.map((head) => (Number.isNaN(head) ? 0 : head))
  evaluate(
    flow,
    start,
    d.wells.map((well) => well.requested),
    state,
    matrix,
  )
  const full = Matrix.zeros(count, count)
  const right = Matrix.zeros(count, 1)
  for (let c = 0; c < count; c++) {
    full.set(c, c, matrix.diag[c] as number)
    if (d.active[c] !== 1 || (d.fixedBy[c] as number) >= 0) continue
    right.set(c, 0, state.imbalance[c] as number)
    const i = c % columns
    if (i > 0) full.set(c, c - 1, -(matrix.west[c] as number))
    if (i < columns - 1) full.set(c, c + 1, -(matrix.east[c] as number))
    if (c >= columns) full.set(c, c - columns, -(matrix.south[c] as number))
    if (c < columns * (rows - 1)) full.set(c, c + columns, -(matrix.north[c] as number))
  }
  const changes = solve(full, right).to1DArray()
  return changes.map((change, c) =>
    d.active[c] === 1 ? (start[c] as number) + change + d.reference : Number.NaN,
  )
}

const coordinate = fc.double({ min: 5, max: 95, noNaN: true })
// Contrasts stay where rounding, on either side, leaves ten digits of the heads.
const conductivity = fc.double({ min: -1.5, max: 1.5, noNaN: true }).map((power) => 10 ** power)

const randomModel = fc
  .record({
    columns: fc.integer({ min: 2, max: 14 }),
    rows: fc.integer({ min: 1, max: 14 }),
    kx: conductivity,
    ratio: fc.double({ min: -1.5, max: 1.5, noNaN: true }).map((power) => 10 ** power),
    inner: conductivity,
    corner: fc.tuple(coordinate, coordinate),
    well: fc.tuple(coordinate, coordinate),
    river: fc.tuple(coordinate, coordinate),
    wall: fc.tuple(coordinate, coordinate, coordinate, coordinate),
    wallK: fc.double({ min: -3, max: 0, noNaN: true }).map((power) => 10 ** power),
  })
  // A well on the very line of the wall is refused, and a wall without length too: neither is what this is about.
  .filter(({ wall: [ax, ay, bx], well: [x, y] }) => {
    const length = Math.hypot(bx - ax, 100 - ay)
    return Math.abs((bx - ax) * (y - ay) - (100 - ay) * (x - ax)) > 0.01 * length
  })
  .map(({ columns, rows, kx, ratio, inner, corner: [x, y], well, river, wall, wallK }) =>
    planModel({
      grid: { columns, rows },
      materials: [
        { name: 'Sand', kx, ky: kx * ratio },
        { name: 'Lens', kx: inner, ky: inner },
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
          top: 7,
        },
      ],
      recharge: [{ name: 'Rain', rate: 1e-3 }],
      wells: [{ name: 'W', x: well[0], y: well[1], kind: 'abstraction', rate: 30 }],
      boundaries: [
        {
          name: 'West',
          kind: 'fixed head',
          line: [
            [0, 0],
            [0, 100],
          ],
          head: [12, 11],
        },
        {
          name: 'River',
          kind: 'head-dependent flux',
          line: [
            [river[0], 0],
            [river[1], 100],
          ],
          head: 9,
          conductance: 0.3,
        },
      ],
      walls: [
        {
          name: 'Wall',
          line: [
            [wall[0], wall[1]],
            [wall[2], 100],
          ],
          thickness: 1,
          k: wallK,
        },
      ],
      solver: { tolerance: 1e-13 },
    }),
  )

/** On very coarse grids a wall may cut a well off from every cell centre; such a model is refused. */
function seesACentre(model: Model): boolean {
  try {
    discretise(model)
    return true
  } catch (error) {
    if (error instanceof ModelError && error.message.includes('smaller cells')) return false
    throw error
  }
}

describe('against a direct solve of the same balance', () => {
  it.each([
    ['relaxation ends', 'sor', false],
    ['multigrid ends', 'multigrid', false],
    ['multigrid in compiled kernels ends', 'multigrid', true],
  ] as const)('%s at the same heads to 1e-10 of their range', (_, method, compiled) => {
    const kernels = compiled ? solverKernels() : undefined
    fc.assert(
      fc.property(randomModel, (model) => {
        fc.pre(seesACentre(model))
        const by = { ...model, solver: { ...model.solver, method } }
        const { heads, result } = solveModel(by, { kernels })
        expect(result.method).toBe(method)
        expect(result.kernels === 'typescript').toBe(!compiled)
        const direct = directHeads(model)
        expect(result.converged).toBe(true)
        const range = Math.max(...heads) - Math.min(...heads) + 1
        direct.forEach((head, c) => {
          expect(Math.abs((heads[c] as number) - head) / range).toBeLessThan(1e-10)
        })
      }),
      { numRuns: 40 },
    )
  })
})
