import { describe, expect, it } from 'vitest'
import { coverage, judgedCases, tightness } from '../../scripts/error-bands/judge'

describe('error bands', () => {
  // The whole series of 200 cases: node --import tsx scripts/error-bands.ts
  const judged = judgedCases(7, 40)

  it('hold the true value of at least 95 % of named results, over random cases with a closed form', () => {
    expect(judged.length).toBeGreaterThan(150)
    expect(coverage(judged)).toBeGreaterThanOrEqual(0.95)
  })

  it('are not so wide that they say nothing: half of them within ten true errors', () => {
    expect(tightness(judged)).toBeLessThan(10)
  })
})
