/** What a row of grids says about the error of the value on one of them. */
export interface GridError {
  /** Estimated largest error of the value on the model's own grid, safety factor included; >= 0. */
  error: number
  /** Observed order of convergence, where the values give one. */
  order: number | null
  /** What Richardson's extrapolation makes of them. */
  extrapolated: number | null
  how: 'observed order' | 'limited order' | 'first order assumed' | 'none'
}

/** Safety factors of the grid convergence index (Roache 1994, J. Fluids Eng. 116, 405): with an observed order ... */
export const safetyFactor = 1.25
/** ... and without. */
const withoutOrder = 3

const leastOrder = 0.5
const formalOrder = 2

/**
 * Error of one of two or three values computed on grids of cell sizes `sizes`, finest first, by Richardson's
 * extrapolation and the grid convergence index. `own`: which of them is the model's. With three values that approach
 * a limit from one side at an order from 0.5 to 2 the observed order counts, above 2 the formal order of 2 with the
 * larger of the two differences. Otherwise the largest difference counts three times, as first order would make it.
 */
export function gridError(values: number[], sizes: number[], own: number): GridError {
  const [f1, f2, f3] = values as [number, number, number | undefined]
  if (f2 === undefined) return { error: 0, order: null, extrapolated: null, how: 'none' }
  const h = sizes.map((size) => size / (sizes[0] as number))
  const r2 = h[1] as number
  if (f3 === undefined) {
    const step = Math.abs(f2 - f1) / (r2 - 1)
    return {
      error: withoutOrder * step * (h[own] as number),
      order: null,
      extrapolated: null,
      how: 'first order assumed',
    }
  }
  const r3 = h[2] as number
  const order = (f2 - f1) * (f3 - f2) > 0 ? observedOrder(f2 - f1, f3 - f2, r2, r3) : null
  if (order !== null && order >= leastOrder) {
    const p = Math.min(order, formalOrder)
    // Rounding makes second order a little more than second order.
    const limited = order > formalOrder + 1e-3
    // f(h) = f0 + c h^p, with c from the finer pair and, at a limited order, no less than from the coarser one.
    const fine = (f2 - f1) / (r2 ** p - 1)
    const coarse = (f3 - f2) / (r3 ** p - r2 ** p)
    const c = limited && Math.abs(coarse) > Math.abs(fine) ? coarse : fine
    return {
      error: safetyFactor * Math.abs(c) * (h[own] as number) ** p,
      order,
      extrapolated: f1 - fine,
      how: limited ? 'limited order' : 'observed order',
    }
  }
  const step = Math.max(Math.abs(f2 - f1) / (r2 - 1), Math.abs(f3 - f2) / (r3 - r2))
  return {
    error: withoutOrder * step * (h[own] as number),
    order,
    extrapolated: null,
    how: 'first order assumed',
  }
}

/** The p with (f3 - f2) / (f2 - f1) = (r3^p - r2^p) / (r2^p - 1), by bisection; null outside -2..10. */
function observedOrder(fine: number, coarse: number, r2: number, r3: number): number | null {
  const wanted = Math.log(coarse / fine)
  const excess = (p: number) => {
    if (Math.abs(p) < 1e-9) return Math.log(Math.log(r3 / r2) / Math.log(r2)) - wanted
    return Math.log((r3 ** p - r2 ** p) / (r2 ** p - 1)) - wanted
  }
  let low = -2
  let high = 10
  if (excess(low) > 0) return null
  if (excess(high) < 0) return high
  for (let step = 0; step < 60; step++) {
    const middle = (low + high) / 2
    if (excess(middle) > 0) high = middle
    else low = middle
  }
  return (low + high) / 2
}
