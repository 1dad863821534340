import type { Cycle } from './cycle'
import type { LinearOptions, LinearOutcome } from './system'

export type Decision = 'go on' | 'cancel' | 'part'

export interface Surroundings {
  /** Lays the right-hand side out where the true residual is formed from it. */
  layOut: () => void
  /** Largest |p|. */
  largest: () => number
  /** After each iteration; the same for all threads that work on the solve. */
  decide: (iterations: number, norm: number) => Decision
  /** The cycle of one thread that does all the rest; null: this thread has no more to do. */
  alone: () => Cycle | null
}

/**
 * Preconditioned conjugate gradients (Hestenes & Stiefel 1952) from where x is. Threads that share the rows all run it
 * and come to the same numbers.
 */
export function conjugateGradients(
  together: Cycle,
  { target, mostIterations }: LinearOptions,
  { layOut, largest, decide, alone }: Surroundings,
): LinearOutcome {
  let cycle = together
  let scale = 1
  function trueNorm(): number {
    layOut()
    return Math.sqrt(cycle.trueResidual(scale))
  }
  let norm = trueNorm()
  // Single precision has no room for numbers far from 1.
  if (norm > 0 && (norm < 1e-20 || norm > 1e20)) {
    scale = 1 / norm
    norm = trueNorm()
  }
  let truth = norm
  let isTruth = true
  let iterations = 0
  let before = norm
  let old = 0
  let alpha = 0
  let descended = false
  let ended: LinearOutcome['ended'] | null = norm <= target ? 'converged' : null
  while (ended === null) {
    if (iterations >= mostIterations) {
      ended = 'iterations'
      break
    }
    if (!descended) cycle.descend()
    const now = cycle.up()
    const pq = now > 0 ? cycle.product(old > 0 ? now / old : 0) : 0
    if (!(pq > 0)) {
      ended = 'stalled'
      break
    }
    old = now
    alpha = now / pq
    // No way down when this step is likely to be the last.
    descended = norm * Math.min(1, norm / before) > 2 * target
    before = norm
    norm = Math.sqrt(cycle.step(alpha, scale, descended))
    isTruth = false
    iterations++
    if (norm <= target) {
      // Rounding lets the recurrence run ahead of the truth: the true residual decides, and is gone on from.
      norm = trueNorm()
      isTruth = true
      descended = false
      if (norm <= target) ended = 'converged'
      else if (norm > 0.5 * truth) ended = 'stalled'
      truth = norm
      before = norm
      old = 0
    }
    const decision = decide(iterations, norm)
    if (ended !== null) break
    if (decision === 'cancel') ended = 'cancelled'
    if (decision === 'part') {
      const rest = alone()
      if (!rest) return { iterations, residual: norm, ended: 'cancelled', error: 0 }
      cycle = rest
    }
  }
  const error = alpha * largest()
  return { iterations, residual: isTruth ? norm : trueNorm(), ended, error }
}
