import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import type { Boundary, Model } from '~/solver/model'
import { type Solution, solveModel } from '~/solver/solve'

interface Bank {
  columns: number
  rows: number
  width: number
  height: number
  /** Horizontal and vertical conductivity of the whole and of a block in its middle. */
  k: [number, number]
  block: [number, number]
  upstream: number
  downstream: number
  /** Length/time on the whole top. */
  recharge: number
  mirrored?: boolean
  shift?: number
}

/** A bank between two waters, a seepage face above the lower one and the top open to let water out. */
function bank(of: Bank, changes: Partial<Model> = {}): Model {
  const { columns, rows, width, height, upstream, downstream, recharge, mirrored, shift = 0 } = of
  const [near, far] = mirrored ? [width, 0] : [0, width]
  const [west, east] = [0.3137, 0.6923].map((share) => (mirrored ? 1 - share : share) * width) as [
    number,
    number,
  ]
  const upright = (x: number, from: number, to: number): [number, number][] => [
    [x, from + shift],
    [x, to + shift],
  ]
  const boundaries: Boundary[] = [
    { name: 'Upper water', kind: 'fixed head', line: upright(near, 0, height), head: upstream + shift },
    { name: 'Lower water', kind: 'fixed head', line: upright(far, 0, downstream), head: downstream + shift },
    { name: 'Face', kind: 'seepage face', line: upright(far, downstream, height) },
    {
      name: 'Top',
      kind: 'seepage face',
      line: [
        [0, height + shift],
        [width, height + shift],
      ],
    },
  ]
  return {
    format: 'lavant-model',
    version: 1,
    units: { length: 'm', time: 'd' },
    kind: 'section',
    flow: 'free surface',
    time: { kind: 'steady' },
    extent: { x: [0, width], y: [shift, height + shift] },
    grid: { columns, rows },
    materials: [
      { name: 'Sand', kx: of.k[0], ky: of.k[1] },
      { name: 'Block', kx: of.block[0], ky: of.block[1] },
    ],
    ground: [
      { material: 'Sand' },
      {
        material: 'Block',
        polygon: [
          [west, 0.2871 * height + shift],
          [east, 0.2871 * height + shift],
          [east, 0.6134 * height + shift],
          [west, 0.6134 * height + shift],
        ],
      },
    ],
    boundaries,
    recharge: recharge > 0 ? [{ name: 'Rain', rate: recharge }] : [],
    solver: { tolerance: 1e-12 },
    ...changes,
  }
}

/**
 * The same bank by brute force: cell after cell takes the pressure head that balances it, or lets fall what reaches it,
 * until nothing changes any more. Written from the equations of single cells, sharing nothing with the solver.
 */
function bruteForce(of: Bank): { p: number[][]; full: number[][] } {
  const { columns, rows, width, height, upstream, downstream, recharge } = of
  const [dx, dz] = [width / columns, height / rows]
  const z = (j: number) => (j + 0.5) * dz
  const inBlock = (i: number, j: number) => {
    const [x, y] = [(i + 0.5) * dx, z(j)]
    return x >= 0.3137 * width && x < 0.6923 * width && y >= 0.2871 * height && y < 0.6134 * height
  }
  const k = (i: number, j: number) => (inBlock(i, j) ? of.block : of.k)
  const harmonic = (a: number, b: number) => (2 * a * b) / (a + b)
  const p = Array.from({ length: rows }, () => Array.from({ length: columns }, () => 0))
  const full = Array.from({ length: rows }, () => Array.from({ length: columns }, () => 0))
  const at = (field: number[][], i: number, j: number) => field[j]?.[i] as number
  for (let sweep = 0; sweep < 400_000; sweep++) {
    let largest = 0
    for (let j = rows - 1; j >= 0; j--) {
      for (let i = 0; i < columns; i++) {
        const [kx, kz] = k(i, j)
        let gets = 0
        let holds = 0
        let lets = 0
        const outlets: { c: number; above: number }[] = []
        for (const side of [-1, 1]) {
          const other = i + side
          if (other >= 0 && other < columns) {
            const c = (harmonic(kx, k(other, j)[0]) * dz) / dx
            gets += c * at(p, other, j)
            holds += c
            continue
          }
          const level = side < 0 ? upstream : downstream
          const [foot, head] = [j * dz, (j + 1) * dz]
          const wet = Math.max(0, Math.min(level, head) - foot)
          const c = (2 * kx) / dx
          // The lower water's line ends at its level, the upper one's runs to the top of the bank.
          const covered = side < 0 ? dz : wet
          if (level > z(j)) {
            gets += c * covered * (level - z(j))
            holds += c * covered
          } else if (wet > 0) outlets.push({ c: c * Math.min(covered, 2 * wet), above: 0 })
          if (side > 0 && wet < dz) {
            outlets.push({ c: c * (dz - wet), above: Math.max(0, (foot + wet + head) / 2 - z(j)) })
          }
        }
        if (j > 0) {
          const c = (harmonic(kz, k(i, j - 1)[1]) * dx) / dz
          gets += c * at(p, i, j - 1)
          holds += c
          lets += c * dz
        }
        if (j < rows - 1) {
          const c = (harmonic(kz, k(i, j + 1)[1]) * dx) / dz
          gets += c * at(p, i, j + 1) + c * dz * at(full, i, j + 1)
          holds += c
        } else gets += recharge * dx
        if (j === rows - 1) outlets.push({ c: (2 * kz * dx) / dz, above: dz / 2 })
        let pressure = Math.max(0, (gets - lets) / holds)
        for (const { c, above } of outlets.sort((a, b) => a.above - b.above)) {
          if (pressure <= above) break
          gets += c * above
          holds += c
          pressure = Math.max(0, (gets - lets) / holds)
        }
        const share = pressure > 0 ? 1 : lets > 0 ? Math.min(1, gets / lets) : 0
        largest = Math.max(largest, Math.abs(pressure - at(p, i, j)), dz * Math.abs(share - at(full, i, j)))
        ;(p[j] as number[])[i] = pressure
        ;(full[j] as number[])[i] = share
      }
    }
    if (largest < 1e-15 * height) break
  }
  return { p, full }
}

const share = fc.double({ min: 0, max: 1, noNaN: true })
const conductivity = fc.double({ min: -1, max: 1, noNaN: true }).map((power) => 10 ** power)
const randomBank: fc.Arbitrary<Bank> = fc
  .record({
    columns: fc.integer({ min: 3, max: 9 }),
    rows: fc.integer({ min: 3, max: 9 }),
    width: fc.double({ min: 4, max: 30, noNaN: true }),
    height: fc.double({ min: 4, max: 12, noNaN: true }),
    k: fc.tuple(conductivity, conductivity),
    block: fc.tuple(conductivity, conductivity),
    up: share,
    down: share,
    rain: fc.constantFrom(0, 0.003, 0.03, 0.3),
  })
  .map(({ up, down, rain, ...rest }) => {
    const upstream = rest.height * (0.3 + 0.7 * up)
    return {
      ...rest,
      upstream,
      // Never quite without water, so that the line of the lower water is never without length.
      downstream: upstream * (0.02 + 0.9 * down),
      recharge: rain * rest.k[1],
    }
  })

/** Pressure heads by row and column; 0 where the ground is not saturated. */
function pressures({ heads, grid }: Solution): number[][] {
  return Array.from({ length: grid.rows }, (_, j) =>
    Array.from({ length: grid.columns }, (_, i) => {
      const head = heads[j * grid.columns + i] as number
      return Number.isNaN(head) ? 0 : head - ((grid.yEdges[j] as number) + (grid.yEdges[j + 1] as number)) / 2
    }),
  )
}

function expectSamePressures(one: number[][], other: number[][], height: number): void {
  one.forEach((row, j) => {
    row.forEach((value, i) => {
      expect(Math.abs(value - (other[j]?.[i] as number)) / height).toBeLessThan(1e-8)
    })
  })
}

function solved(model: Model): Solution {
  const solution = solveModel(model)
  expect(solution.result.converged).toBe(true)
  expect(Math.abs(solution.result.balance.errorPercent[0] as number)).toBeLessThan(1e-6)
  return solution
}

describe('flow with a free surface against brute force', () => {
  it.each(['sor', 'multigrid'] as const)(
    'cell after cell ends at the same pressure heads as %s',
    (method) => {
      fc.assert(
        fc.property(randomBank, (of) => {
          const solution = solved(bank(of, { solver: { method, tolerance: 1e-12 } }))
          expectSamePressures(pressures(solution), bruteForce(of).p, of.height)
        }),
        { numRuns: 25 },
      )
    },
  )
})

describe('flow with a free surface', () => {
  it('is the same in a mirror', () => {
    fc.assert(
      fc.property(randomBank, (of) => {
        const there = pressures(solved(bank(of)))
        const back = pressures(solved(bank({ ...of, mirrored: true })))
        expectSamePressures(
          there,
          back.map((row) => [...row].reverse()),
          of.height,
        )
      }),
      { numRuns: 20 },
    )
  })

  it('is the same a thousand metres higher', () => {
    fc.assert(
      fc.property(randomBank, (of) => {
        expectSamePressures(
          pressures(solved(bank(of))),
          pressures(solved(bank({ ...of, shift: 1000 }))),
          of.height,
        )
      }),
      { numRuns: 20 },
    )
  })

  it('the discharge of homogeneous ground is k (H² - t²) / 2L whatever the grid (Charny 1951)', () => {
    fc.assert(
      fc.property(randomBank, (of) => {
        const rows = 10
        const up = Math.max(2, Math.round((of.upstream / of.height) * rows))
        const down = Math.max(1, Math.min(up - 1, Math.round((of.downstream / of.height) * rows)))
        const [upstream, downstream] = [(up * of.height) / rows, (down * of.height) / rows]
        const even: Bank = { ...of, rows, upstream, downstream, recharge: 0, block: of.k }
        const inflow = solved(bank(even)).result.balance.inflow[0] as number
        const exact = (of.k[0] * (upstream ** 2 - downstream ** 2)) / (2 * of.width)
        expect(Math.abs(inflow / exact - 1)).toBeLessThan(1e-8)
      }),
      { numRuns: 20 },
    )
  })
})
