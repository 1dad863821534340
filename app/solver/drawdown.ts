import type { Model } from './model'
import type { DrawdownResult, Result } from './result'

/** Names of the points that stand where the wells are while they are off. */
const atWell = ' (well off)'

/** The model with all its wells off, a point in place of each. */
export function withWellsOff(model: Model): Model {
  const stands = (model.wells ?? []).map(({ name, x, y }) => ({ name: name + atWell, x, y }))
  return { ...model, wells: [], points: [...(model.points ?? []), ...stands], want: {} }
}

/** Drawdown at points and wells: heads of the run with wells off less those with them, at the times of the latter. */
export function drawdownOf(own: Result, off: Result): DrawdownResult {
  const before = new Map(off.points.map(({ name, head }) => [name, head]))
  function drawdown(name: string, heads: (number | null)[]): { name: string; drawdown: (number | null)[] } {
    return {
      name,
      drawdown: heads.map((head, k) => {
        const rest = restAt(own, off, before.get(name), k)
        return head === null || rest === null ? null : rest - head
      }),
    }
  }
  return {
    points: own.points.map(({ name, head }) => drawdown(name, head)),
    wells: own.wells.map(({ name, wellHead, cellHead }) => {
      const heads = wellHead.some((head) => head !== null) ? wellHead : cellHead
      return { name, drawdown: drawdown(name + atWell, heads).drawdown }
    }),
  }
}

/** The head at rest at the k-th time of the run; null where the other run did not report then. */
function restAt(own: Result, off: Result, heads: (number | null)[] | undefined, k: number): number | null {
  if (own.times.length === 0) return heads?.[0] ?? null
  const time = own.times[k] as number
  const at = off.times.findIndex((other) => Math.abs(other - time) <= 1e-9 * Math.max(1, Math.abs(time)))
  return heads?.[at] ?? null
}
