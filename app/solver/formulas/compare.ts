import type { Model } from '~/solver/model'
import type { FormulaComparison, Result } from '~/solver/result'
import { circleFormula } from './circle'
import { endlessFormula } from './endless'
import { type Formula, meanRound } from './formula'
import { rectangleFormula } from './rectangle'

/** The formula that holds for a model as it stands, or null. Strict: nothing of the model may be left out of it. */
export function formulaOf(model: Model): Formula | null {
  return rectangleFormula(model) ?? circleFormula(model) ?? endlessFormula(model)
}

/** Heads at points and well faces beside those of the formula that holds for the model; null where none does. */
export function comparisonOf(model: Model, result: Result): FormulaComparison | null {
  const formula = formulaOf(model)
  if (!formula) return null
  const times = result.times.length === 0 ? [0] : result.times
  const results: FormulaComparison['results'] = []
  function compare(name: string, heads: (number | null)[], valueAt: (time: number) => number | null): void {
    const values = times.map(valueAt)
    if (values.every((value) => value === null)) return
    const differences = values.map((value, k) => {
      const head = heads[k] ?? null
      return value === null || head === null ? null : head - value
    })
    results.push({ name, formula: values, difference: differences })
  }
  for (const [index, { name, head }] of result.points.entries()) {
    const point = model.points?.[index]
    if (point) compare(`points/${name}`, head, (time) => formula.headAt(point.x, point.y, time))
  }
  for (const [index, { name, wellHead, achieved, requested }] of result.wells.entries()) {
    const well = model.wells?.[index]
    if (!well?.radius || achieved.some((rate, k) => rate < 0.999999 * (requested[k] as number))) continue
    const { x, y, radius } = well
    compare(`wells/${name}`, wellHead, (time) => {
      const mean = meanRound(x, y, radius, (px, py) => formula.headAt(px, py, time) ?? Number.NaN)
      return Number.isNaN(mean) ? null : mean
    })
  }
  const { name, source, extentEffect } = formula
  return { name, source, extentEffect, results }
}
