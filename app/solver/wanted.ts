import type { SolverOptions } from './balancer'
import { type CaptureRaster, captureOf } from './capture'
import type { Discretised } from './discretise'
import { drawdownOf, withWellsOff } from './drawdown'
import { checkFlowLines, flowLineResults, velocitiesOf } from './flow-lines'
import type { Model } from './model'
import { ModelError } from './model-error'
import { namesOf } from './named-functions'
import type { Report, RunRecord } from './record'
import { responsesOf } from './responses'
import type { Result } from './result'
import { sensitivitiesOf } from './sensitivities'
import { applyVerification, type Solved, verificationOf } from './verify'

/** Fields that belong to what a run adds, too large for its result. */
export interface Pictures {
  capture?: CaptureRaster
  /** By result, d(result) / d(ln K of each cell), 0 where there is no ground. */
  sensitivities?: Map<string, Float64Array>
  /** At the end; NaN where there is no ground. */
  drawdown?: Float64Array
}

/** Refuses wishes that cannot be met, before anything is solved. */
export function checkWanted(d: Discretised): void {
  checkFlowLines(d)
  const { model } = d
  const want = model.want
  const asked: [string, boolean][] = [
    ['sensitivities', (want?.sensitivities?.length ?? 0) > 0],
    ['responses', want?.responses === true],
  ]
  for (const [wish, is] of asked) {
    if (!is) continue
    if (model.time.kind === 'transient') throw notComputed(wish, 'transient flow')
    if (model.flow === 'free surface') throw notComputed(wish, 'a section with a free surface')
  }
  const names = new Set(namesOf(d))
  for (const [index, name] of (want?.sensitivities ?? []).entries()) {
    if (!names.has(name)) {
      throw new ModelError(
        `want.sensitivities[${index}]`,
        `there is no result "${name}"; results are called "points/P1", "wells/W1", "lines/Name", "rings/Name/through"`,
      )
    }
  }
}

function notComputed(wish: string, of: string): ModelError {
  return new ModelError(`want.${wish}`, `not computed by this version: ${wish} of ${of}`)
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
    if (want.flowLines) {
      result.flowLines = flowLineResults(velocities)
      for (const wish of want.flowLines) {
        if (!('well' in wish) || result.flowLines.some(({ well }) => well === wish.well)) continue
        result.warnings.push({
          code: 'no-flow-lines',
          severity: 'note',
          text: `No flow line ${wish.direction === 'back' ? 'leads to' : 'leaves'} the well "${wish.well}".`,
        })
      }
    }
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
  if (!result.converged) return
  if ((want.responses || want.sensitivities) && result.warnings.some(({ code }) => code === 'well-reduced')) {
    result.warnings.push({
      code: 'reduced-wells-held',
      severity: 'check',
      text: 'Responses and sensitivities hold every rate as it is, but a well here gives less than asked for: its rate would change with its level.',
    })
  }
  if (want.responses) result.responses = orCancelled(solution, responsesOf(outcome, options))
  if (want.sensitivities && want.sensitivities.length > 0) {
    const found = orCancelled(solution, sensitivitiesOf(model, outcome, want.sensitivities, options))
    if (found) {
      result.sensitivities = found.results
      pictures.sensitivities = found.perLnK
    }
  }
  if (want.drawdown && result.wells.length > 0) {
    const off = solveOther(withWellsOff(model), 'wells off')
    if (off.cancelled) solution.cancelled = true
    else {
      result.drawdown = drawdownOf(result, off.result)
      pictures.drawdown = off.heads.map((head, cell) => head - (solution.heads[cell] as number))
    }
  }
  if (want.verify) {
    const first = (run.reports[0] as Report).d
    const verification = verificationOf(model, first, solution, (other, variant) =>
      solveOther(other, `verification: ${variant.phase}`, variant.halveSteps),
    )
    if (verification) applyVerification(result, verification)
    else solution.cancelled = true
  }
}

/** What was found, or nothing where it was stopped on the way. */
function orCancelled<Found>(solution: Wanting, found: Found | null): Found | undefined {
  if (found !== null) return found
  solution.cancelled = true
  return undefined
}
