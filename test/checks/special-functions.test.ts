import { describe, expect, it } from 'vitest'
import { besselK0, leakyWellFunction, wellFunction } from '~/solver/formulas/special-functions'
import published from './published.json'

function check<Inputs, Expected>(id: string): { source: string; inputs: Inputs; expected: Expected } {
  return published.find((entry) => entry.id === id) as unknown as {
    source: string
    inputs: Inputs
    expected: Expected
  }
}

function relative(value: number, reference: number): number {
  return Math.abs(value - reference) / Math.abs(reference)
}

describe('special functions', () => {
  it('the well function W(u) has the values of the printed table (PT-01)', () => {
    const { inputs, expected } = check<{ u: number[] }, { W: number[]; printed: number[] }>('PT-01')
    inputs.u.forEach((u, k) => {
      expect(relative(wellFunction(u), expected.W[k] as number)).toBeLessThan(1e-7)
    })
  })

  it('the leaky well function W(u, r/B) has the values of its table (PT-05)', () => {
    const { inputs, expected } = check<
      { pairs_u_rB: [number, number][] },
      { W: number[]; limit_2K0: Record<string, number> }
    >('PT-05')
    inputs.pairs_u_rB.forEach(([u, b], k) => {
      expect(relative(leakyWellFunction(u, b), expected.W[k] as number)).toBeLessThan(1e-7)
    })
    for (const [b, value] of Object.entries(expected.limit_2K0)) {
      expect(relative(2 * besselK0(Number(b)), value)).toBeLessThan(1e-7)
      expect(relative(leakyWellFunction(1e-12, Number(b)), value)).toBeLessThan(1e-7)
    }
  })

  it('K0 has the values of Abramowitz & Stegun, table 9.8 and 9.9, on both sides of its change of method', () => {
    for (const [x, value] of [
      [0.1, 2.4270690247],
      [1, 0.4210244382],
      [2, 0.1138938727],
      [2.0000001, 0.1138938587],
      [5, 0.00369109833404],
      [20, 5.741237815e-10],
    ] as const) {
      expect(relative(besselK0(x), value)).toBeLessThan(1e-9)
    }
  })

  it('without leakage the leaky well function is the well function', () => {
    for (const u of [1e-6, 0.01, 1, 4]) {
      expect(relative(leakyWellFunction(u, 1e-7), wellFunction(u))).toBeLessThan(1e-9)
    }
  })
})
