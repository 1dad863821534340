import type { Result } from '~/solver/result'
import { formatNumber } from '~/units'

/**
 * A result as it stands at one of its reported times, the last unless said otherwise: every list by time keeps that
 * entry alone, so that pages read a run in time as they read a steady one. A steady result comes back as it is.
 */
export function resultAt(result: Result, at = result.times.length - 1): Result {
  if (result.times.length === 0) return result
  const only = <Value>(values: readonly Value[]) => values.slice(at, at + 1)
  const flow = <Flow extends { inflow: number[]; outflow: number[] }>(one: Flow): Flow => ({
    ...one,
    inflow: only(one.inflow),
    outflow: only(one.outflow),
  })
  return {
    ...result,
    times: only(result.times),
    points: result.points.map((point) => ({ ...point, head: only(point.head) })),
    wells: result.wells.map((well) => ({
      ...well,
      requested: only(well.requested),
      achieved: only(well.achieved),
      cellHead: only(well.cellHead),
      wellHead: only(well.wellHead),
    })),
    lines: result.lines.map((line) => ({ ...line, discharge: only(line.discharge) })),
    rings: result.rings.map((ring) => ({
      ...ring,
      through: only(ring.through),
      recharge: only(ring.recharge),
      wells: only(ring.wells),
      leakage: only(ring.leakage),
      boundaries: only(ring.boundaries),
      storage: only(ring.storage),
      error: only(ring.error),
    })),
    boundaries: result.boundaries.map(flow),
    recharge: result.recharge.map(flow),
    leakage: result.leakage.map(flow),
    balance: {
      ...flow(result.balance),
      storage: only(result.balance.storage),
      errorPercent: only(result.balance.errorPercent),
      kinds: result.balance.kinds.map(flow),
      worstCell: only(result.balance.worstCell),
    },
  }
}

/** " at 30 d" for a result in time, '' for a steady one. */
export function momentInWords(result: Result, unit: string): string {
  const time = result.times.at(-1)
  return time === undefined ? '' : ` at ${formatNumber(time)} ${unit}`
}
