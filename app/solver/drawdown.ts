import type { Model } from './model'
import type { DrawdownResult, Result } from './result'

/** The model with all its wells off: there, but without a rate. */
export function withWellsOff(model: Model): Model {
  const wells = (model.wells ?? []).map(({ lowestLevel, ...well }) => ({ ...well, rate: 0 }))
  return { ...model, wells, want: {} }
}

/** Drawdown at points and wells: heads of the run with wells off less those with them, at the times of the latter. */
export function drawdownOf(own: Result, off: Result): DrawdownResult {
  function drawdown(heads: (number | null)[], rest: (number | null)[]): (number | null)[] {
    return heads.map((head, k) => {
      const before = restAt(own, off, rest, k)
      return head === null || before === null ? null : before - head
    })
  }
  return {
    points: own.points.map(({ name, head }, index) => {
      return { name, drawdown: drawdown(head, off.points[index]?.head ?? []) }
    }),
    wells: own.wells.map(({ name, wellHead, cellHead }, index) => {
      const rest = off.wells[index]
      const atFace = wellHead.some((head) => head !== null)
      const heads = atFace ? wellHead : cellHead
      return { name, drawdown: drawdown(heads, (atFace ? rest?.wellHead : rest?.cellHead) ?? []) }
    }),
  }
}

/** The head at rest at the k-th time of the run; null where the other run did not report then. */
function restAt(own: Result, off: Result, heads: (number | null)[], k: number): number | null {
  if (own.times.length === 0) return heads[0] ?? null
  const time = own.times[k] as number
  const at = off.times.findIndex((other) => Math.abs(other - time) <= 1e-9 * Math.max(1, Math.abs(time)))
  return heads[at] ?? null
}
