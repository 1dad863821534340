/** One comparison: heads in the project's length unit. */
export interface Pair {
  measured: number
  modelled: number
}

export interface FitStatistics {
  n: number
  /** Mean residual. */
  bias: number
  /** Mean absolute residual. */
  mae: number
  /** Root of the mean squared residual. */
  rmse: number
  /** RMSE over the range of the measured heads; null when they do not differ. */
  scaledRmse: number | null
  /** The residual that is furthest from zero, with its sign. */
  largest: number
}

/** residual = measured - modelled: above zero where the model's head is too low. */
export function residual(pair: Pair): number {
  return pair.measured - pair.modelled
}

/**
 * Statistics of the residuals of n comparisons, in the unit of the heads (scaled RMSE has none). Null for none.
 * Source: Anderson, Woessner & Hunt (2015), Applied Groundwater Modeling, ch. 9; the scaled RMSE is RMSE over the range
 * of measured heads, as the published check OD-01 in test/checks has it.
 */
export function fitStatistics(pairs: readonly Pair[]): FitStatistics | null {
  if (pairs.length === 0) return null
  const n = pairs.length
  let sum = 0
  let absolute = 0
  let squares = 0
  let largest = 0
  let low = Number.POSITIVE_INFINITY
  let high = Number.NEGATIVE_INFINITY
  for (const pair of pairs) {
    const r = residual(pair)
    sum += r
    absolute += Math.abs(r)
    squares += r * r
    if (Math.abs(r) > Math.abs(largest)) largest = r
    low = Math.min(low, pair.measured)
    high = Math.max(high, pair.measured)
  }
  const rmse = Math.sqrt(squares / n)
  return {
    n,
    bias: sum / n,
    mae: absolute / n,
    rmse,
    scaledRmse: high > low ? rmse / (high - low) : null,
    largest,
  }
}
