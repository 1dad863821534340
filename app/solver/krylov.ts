/** Tells a Krylov method to end, with the norm it has come down to. */
export interface KrylovOutcome {
  /** Norm of what the method itself took for the residual; recompute it from the definition. */
  residual: number
  steps: number
}

/**
 * Solves A y = r by generalised minimal residuals with a preconditioner that may differ from step to step (Saad 1993,
 * SIAM J. Sci. Comput. 14, 461), `most` steps without a restart. `apply(v, out)`: out = A v; `precondition(v, out)`:
 * out is about the solution of A out = v. Ends at the norm `target`, or when `most` steps are done. `y` is set.
 */
export function flexibleMinimalResiduals(
  apply: (v: Float64Array, out: Float64Array) => void,
  precondition: (v: Float64Array, out: Float64Array) => boolean,
  r: Float64Array,
  y: Float64Array,
  target: number,
  most: number,
): KrylovOutcome {
  const n = r.length
  y.fill(0)
  const norm = norm2(r)
  if (norm <= target || norm === 0) return { residual: norm, steps: 0 }
  const basis: Float64Array[] = [r.map((value) => value / norm)]
  const found: Float64Array[] = []
  // Columns of the Hessenberg matrix, turned upper triangular by rotations as they come.
  const columns: number[][] = []
  const cosines: number[] = []
  const sines: number[] = []
  const rhs = [norm]
  let steps = 0
  while (steps < most && Math.abs(rhs[steps] as number) > target) {
    const z = new Float64Array(n)
    const goOn = precondition(basis[steps] as Float64Array, z)
    const w = new Float64Array(n)
    apply(z, w)
    const h: number[] = []
    for (const v of basis) {
      const dot = inner(v, w)
      h.push(dot)
      for (let c = 0; c < n; c++) w[c] = (w[c] as number) - dot * (v[c] as number)
    }
    const length = norm2(w)
    for (let k = 0; k < steps; k++) {
      const [a, b] = [h[k] as number, h[k + 1] as number]
      h[k] = (cosines[k] as number) * a + (sines[k] as number) * b
      h[k + 1] = (cosines[k] as number) * b - (sines[k] as number) * a
    }
    const last = h[steps] as number
    const radius = Math.hypot(last, length)
    if (radius === 0) break
    cosines.push(last / radius)
    sines.push(length / radius)
    h[steps] = radius
    rhs.push(-(length / radius) * (rhs[steps] as number))
    rhs[steps] = (last / radius) * (rhs[steps] as number)
    columns.push(h)
    found.push(z)
    steps++
    if (!goOn || length === 0) break
    basis.push(w.map((value) => value / length))
  }
  const shares = Array.from({ length: steps }, () => 0)
  for (let k = steps - 1; k >= 0; k--) {
    let sum = rhs[k] as number
    for (let m = k + 1; m < steps; m++) sum -= ((columns[m] as number[])[k] as number) * (shares[m] as number)
    shares[k] = sum / ((columns[k] as number[])[k] as number)
  }
  for (const [k, z] of found.entries()) {
    const share = shares[k] as number
    for (let c = 0; c < n; c++) y[c] = (y[c] as number) + share * (z[c] as number)
  }
  return { residual: Math.abs(rhs[steps] as number), steps }
}

function inner(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let c = 0; c < a.length; c++) sum += (a[c] as number) * (b[c] as number)
  return sum
}

function norm2(a: Float64Array): number {
  return Math.sqrt(inner(a, a))
}
