import type { LinearOptions, LinearOutcome, Prepared } from './system'

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let c = 0; c < a.length; c++) sum += (a[c] as number) * (b[c] as number)
  return sum
}

/** into = a + factor * b. */
function combine(into: Float64Array, a: Float64Array, factor: number, b: Float64Array): void {
  for (let c = 0; c < into.length; c++) into[c] = (a[c] as number) + factor * (b[c] as number)
}

/**
 * Solves A x = b for an unsymmetric A by BiCGStab (van der Vorst 1992, SIAM J. Sci. Stat. Comput. 13, 631), with
 * the multigrid cycle of a symmetric matrix near A as preconditioner from the right, so that residuals are true
 * ones. `apply(v, out)`: out = A v, with 0 where there is no equation. `x`: start in, solution out. When the method
 * breaks down or its residual has drifted from the true one it starts anew from where it is; `stalled` when that gains nothing.
 */
export function solveUnsymmetric(
  apply: (x: Float64Array, out: Float64Array) => void,
  prepared: Prepared,
  b: Float64Array,
  x: Float64Array,
  { target, mostIterations, watch }: LinearOptions,
): LinearOutcome {
  const n = b.length
  const numbers = () => new Float64Array(n)
  const [r, shadow, p, v, t] = [numbers(), numbers(), numbers(), numbers(), numbers()]
  const [pHat, rHat] = [numbers(), numbers()]
  let error = 0
  let iterations = 0
  let ended: LinearOutcome['ended'] | null = null

  function trueResidual(): number {
    apply(x, v)
    combine(r, b, -1, v)
    return Math.sqrt(dot(r, r))
  }

  /** One run from the present x; true: it broke down or came to its own idea of the target. */
  function run(start: number): void {
    shadow.set(r)
    p.fill(0)
    v.fill(0)
    let [rho, alpha, omega] = [1, 1, 1]
    let best = start
    let idle = 0
    while (iterations < mostIterations) {
      const next = dot(shadow, r)
      const beta = (next / rho) * (alpha / omega)
      if (!Number.isFinite(beta) || next === 0) return
      rho = next
      for (let c = 0; c < n; c++) {
        p[c] = (r[c] as number) + beta * ((p[c] as number) - omega * (v[c] as number))
      }
      prepared.precondition(p, pHat)
      apply(pHat, v)
      alpha = rho / dot(shadow, v)
      if (!Number.isFinite(alpha)) return
      combine(r, r, -alpha, v)
      prepared.precondition(r, rHat)
      apply(rHat, t)
      const square = dot(t, t)
      omega = square > 0 ? dot(t, r) / square : 0
      error = 0
      for (let c = 0; c < n; c++) {
        const change = alpha * (pHat[c] as number) + omega * (rHat[c] as number)
        error = Math.max(error, Math.abs(change))
        x[c] = (x[c] as number) + change
      }
      combine(r, r, -omega, t)
      iterations++
      const norm = Math.sqrt(dot(r, r))
      if (watch?.(iterations, norm)) {
        ended = 'cancelled'
        return
      }
      if (norm <= target || omega === 0 || !Number.isFinite(norm)) return
      if (norm < 0.9 * best) {
        best = norm
        idle = 0
      } else if (++idle >= 20) return
    }
    ended = 'iterations'
  }

  if (dot(b, b) === 0) x.fill(0)
  let norm = trueResidual()
  const kept = x.slice()
  while (ended === null) {
    if (norm <= target) {
      ended = 'converged'
      break
    }
    kept.set(x)
    run(norm)
    const before = norm
    norm = trueResidual()
    if (!(norm < before)) {
      // Nothing gained: go back to the better of the two.
      x.set(kept)
      norm = trueResidual()
      ended ??= 'stalled'
    } else if (norm > 0.5 * before && norm > target) ended ??= 'stalled'
  }
  return { iterations, residual: norm, ended, error }
}
