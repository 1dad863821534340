import type { SolverOptions } from './balancer'
import { type CaptureRaster, captureOf } from './capture'
import type { Discretised } from './discretise'
import { checkFlowLines, flowLineResults, velocitiesOf } from './flow-lines'
import type { Model } from './model'
import type { Report, RunRecord } from './record'
import type { Result } from './result'
import { applyVerification, type Solved, verificationOf } from './verify'

/** Fields that belong to what a run adds, too large for its result. */
export interface Pictures {
  capture?: CaptureRaster
}

/** Refuses wishes that cannot be met, before anything is solved. */
export function checkWanted(d: Discretised): void {
  checkFlowLines(d)
}

interface Wanting extends Solved {
  result: Result
  pictures: Pictures
}

/**
 * Adds what the model wants besides heads to the solution of its run. `solve` computes other models: the same on
 * another grid, for example.
 */
export function addWanted(
  model: Model,
  run: RunRecord,
  solution: Wanting,
  options: SolverOptions,
  solve: (model: Model, options: SolverOptions) => Solved,
): void {
  const { want } = model
  if (!want || !run.lastField) return
  const { result, pictures } = solution
  const { outcome } = run.reports[run.reports.length - 1] as Report
  if ((want.flowLines?.length ?? 0) > 0 || want.captureZones) {
    const velocities = velocitiesOf(run.lastField(), outcome)
    if (want.flowLines) result.flowLines = flowLineResults(velocities)
    const times = want.captureZones?.times ?? []
    const capture = want.captureZones && captureOf(velocities, times, { isCancelled: options.isCancelled })
    if (capture) {
      result.captureZones = capture.result
      pictures.capture = capture.raster
    }
  }
  const solveOther = (other: Model, phase: string, halveSteps = false) =>
    solve(other, {
      ...options,
      halveSteps,
      onProgress: options.onProgress && ((progress) => options.onProgress?.({ ...progress, phase })),
    })
  if (want.verify && result.converged) {
    const first = (run.reports[0] as Report).d
    const verification = verificationOf(model, first, solution, (other, variant) =>
      solveOther(other, `verification: ${variant.phase}`, variant.halveSteps),
    )
    if (verification) applyVerification(result, verification)
    else solution.cancelled = true
  }
}
