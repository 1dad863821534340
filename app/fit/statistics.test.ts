import { readFileSync } from 'node:fs'
import { Matrix, solve } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { fitStatistics, residual } from './statistics'

describe('fit statistics', () => {
  it('takes a residual as measured minus modelled', () => {
    expect(residual({ measured: 10.2, modelled: 10 })).toBeCloseTo(0.2, 12)
  })

  it('has nothing to say of no comparison, and no scaled RMSE of a single one', () => {
    expect(fitStatistics([])).toBeNull()
    expect(fitStatistics([{ measured: 3, modelled: 2.5 }])).toEqual({
      n: 1,
      bias: 0.5,
      mae: 0.5,
      rmse: 0.5,
      scaledRmse: null,
      largest: 0.5,
    })
  })

  it('agrees with the plane fitted to 85 measured heads of a real aquifer', () => {
    // OD-01: Harper & Furr (1986) Battelle BMI/ONWI-587; Cressie (1993) p. 212-214. Figures recomputed by QR.
    const rows = readFileSync('test/checks/data/wolfcamp_heads.csv', 'utf8')
      .trim()
      .split('\n')
      .slice(1)
      .map((line) => line.split(',').map(Number) as [number, number, number])
    const design = new Matrix(rows.map(([x, y]) => [1, x * 1000, y * 1000]))
    const plane = solve(design, Matrix.columnVector(rows.map(([, , h]) => h)))
    const modelled = design.mmul(plane).to1DArray()
    const statistics = fitStatistics(
      rows.map(([, , measured], i) => ({ measured, modelled: modelled[i] ?? Number.NaN })),
    )
    expect(statistics?.n).toBe(85)
    expect(statistics?.bias).toBeCloseTo(0, 6)
    expect(statistics?.rmse).toBeCloseTo(61.184428, 5)
    expect(statistics?.mae).toBeCloseTo(51.072797, 5)
    expect(statistics?.scaledRmse).toBeCloseTo(0.078814288, 8)
  })
})
