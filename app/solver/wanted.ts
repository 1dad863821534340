import { type CaptureRaster, captureOf } from './capture'
import type { Discretised } from './discretise'
import { checkFlowLines, flowLineResults, velocitiesOf } from './flow-lines'
import type { Model } from './model'
import type { Watch } from './newton'
import type { Report, RunRecord } from './record'
import type { Result } from './result'

/** Fields that belong to what a run adds, too large for its result. */
export interface Pictures {
  capture?: CaptureRaster
}

/** Refuses wishes that cannot be met, before anything is solved. */
export function checkWanted(d: Discretised): void {
  checkFlowLines(d)
}

/** Adds what the model wants besides heads to the result of its run; what is too large for it comes back. */
export function addWanted(model: Model, run: RunRecord, result: Result, options: Watch): Pictures {
  const pictures: Pictures = {}
  const { want } = model
  if (!want || !run.lastField) return pictures
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
  return pictures
}
