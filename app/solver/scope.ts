import type { Model } from './model'
import { ModelError, requirePositive } from './model-error'
import { checkVerticalExtents } from './vertical-flow'

/** Refuses by name, with its path, everything a model file may hold that this version does not compute. */
export function refuseWhatIsNotComputed(model: Model): void {
  const inSection = model.flow === 'saturated' || model.flow === 'free surface'
  if (model.kind === 'plan' && inSection) {
    throw new ModelError(
      'flow',
      `"${model.flow}" belongs to a vertical section; in plan it is confined or unconfined`,
    )
  }
  if (model.kind === 'section' && !inSection) {
    throw new ModelError(
      'flow',
      `"${model.flow}" belongs to a plan; in a vertical section it is saturated or free surface`,
    )
  }
  if (model.solver?.tolerance !== undefined) {
    const tolerance = requirePositive(model.solver.tolerance, 'solver.tolerance')
    if (tolerance > 1e-3) throw new ModelError('solver.tolerance', 'above 0.001 the heads would mean little')
  }
  checkVerticalExtents(model)
  model.boundaries?.forEach((boundary, index) => {
    if (model.kind === 'plan' && boundary.kind === 'seepage face') {
      throw new ModelError(
        `boundaries[${index}].kind`,
        `"${boundary.name}": a seepage face belongs to a vertical section`,
      )
    }
  })
  if (model.kind === 'section' && model.leakage && model.leakage.length > 0) {
    throw new ModelError(
      'leakage[0]',
      'leakage belongs to a plan; a vertical section shows the aquitard itself',
    )
  }
}
