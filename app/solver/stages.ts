import type { Boundary, ByStage, Model, Stage, StageValue, Value } from './model'
import { ModelError, requireFinite, requirePositive } from './model-error'

/** The stages of a model's time, one for steady flow. */
export function stageCount(model: Model): number {
  return model.time.kind === 'steady' ? 1 : model.time.stages.length
}

/** Refuses stages without a duration and steps that do not lead through them. */
export function checkStages(stages: Stage[]): void {
  if (stages.length === 0) throw new ModelError('time.stages', 'there is no stage: give at least one')
  stages.forEach((stage, index) => {
    const path = `time.stages[${index}]`
    requirePositive(stage.duration, `${path}.duration`)
    if (stage.firstStep !== undefined) requirePositive(stage.firstStep, `${path}.firstStep`)
    if (stage.largestStep !== undefined) requirePositive(stage.largestStep, `${path}.largestStep`)
    if (stage.growth !== undefined && requireFinite(stage.growth, `${path}.growth`) < 1) {
      throw new ModelError(`${path}.growth`, 'steps grow or stay: 1 or more')
    }
  })
}

/**
 * The model as it stands in one stage: plain values in place of values by stage, so that what lays it out on the grid
 * knows no stages. Throws ModelError where a list's length is not the number of stages.
 */
export function modelOfStage(model: Model, stage: number): Model {
  const count = stageCount(model)
  function entryOf(value: number[], path: string): number {
    if (value.length !== count) {
      throw new ModelError(
        path,
        `has ${value.length} values for ${count} ${count === 1 ? 'stage' : 'stages'}`,
      )
    }
    return requireFinite(value[stage], `${path}[${stage}]`)
  }
  function byStage({ stages }: ByStage, path: string): StageValue {
    if (stages.length !== count) {
      throw new ModelError(
        `${path}.stages`,
        `has ${stages.length} entries for ${count} ${count === 1 ? 'stage' : 'stages'}`,
      )
    }
    return stages[stage] as StageValue
  }
  /** On wells, recharge and leakage a plain array is one value a stage. */
  function single(value: Value, path: string): number {
    const plain = typeof value === 'object' && 'stages' in value ? byStage(value, path) : value
    if (typeof plain === 'number') return plain
    if (plain !== value) throw new ModelError(`${path}.stages[${stage}]`, 'must be one number')
    return entryOf(plain, path)
  }
  /** On a line a plain array is one value a vertex. */
  function along(value: Value, path: string): StageValue {
    return typeof value === 'object' && 'stages' in value ? byStage(value, path) : value
  }
  function boundaryOf(boundary: Boundary, index: number): Boundary {
    const path = `boundaries[${index}]`
    switch (boundary.kind) {
      case 'fixed head':
        return { ...boundary, head: along(boundary.head, `${path}.head`) }
      case 'specified flux':
        return { ...boundary, flux: along(boundary.flux, `${path}.flux`) }
      case 'head-dependent flux':
        return {
          ...boundary,
          head: along(boundary.head, `${path}.head`),
          conductance: along(boundary.conductance, `${path}.conductance`),
          ...(boundary.disconnectsBelow === undefined
            ? {}
            : { disconnectsBelow: along(boundary.disconnectsBelow, `${path}.disconnectsBelow`) }),
        }
      case 'drain':
        return {
          ...boundary,
          level: along(boundary.level, `${path}.level`),
          conductance: along(boundary.conductance, `${path}.conductance`),
        }
      default:
        return boundary
    }
  }
  return {
    ...model,
    wells: model.wells?.map((well, index) => ({ ...well, rate: single(well.rate, `wells[${index}].rate`) })),
    recharge: model.recharge?.map((entry, index) => ({
      ...entry,
      rate: single(entry.rate, `recharge[${index}].rate`),
    })),
    leakage: model.leakage?.map((entry, index) => ({
      ...entry,
      head: single(entry.head, `leakage[${index}].head`),
    })),
    boundaries: model.boundaries?.map(boundaryOf),
  }
}

/** Lowest and highest level in every stage that heads are known to start from or be drawn to: in the model's datum. */
export function knownLevels(model: Model): { lowest: number; highest: number } {
  let lowest = Number.POSITIVE_INFINITY
  let highest = Number.NEGATIVE_INFINITY
  function include(value: number | null): void {
    if (value === null || !Number.isFinite(value)) return
    lowest = Math.min(lowest, value)
    highest = Math.max(highest, value)
  }
  function includeAll(value: Value): void {
    const entries = typeof value === 'object' && 'stages' in value ? value.stages : [value]
    for (const entry of entries.flat()) include(entry)
  }
  for (const boundary of model.boundaries ?? []) {
    if (boundary.kind === 'fixed head' || boundary.kind === 'head-dependent flux') includeAll(boundary.head)
    if (boundary.kind === 'drain') includeAll(boundary.level)
    if (boundary.kind === 'seepage face') for (const [, elevation] of boundary.line ?? []) include(elevation)
  }
  for (const leakage of model.leakage ?? []) includeAll(leakage.head)
  if (model.time.kind === 'transient') {
    const start = model.time.initialHead
    if (typeof start === 'number') include(start)
    else if (Array.isArray(start)) for (const head of start) include(head)
  }
  return { lowest, highest }
}
