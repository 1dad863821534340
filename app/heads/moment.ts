import type { Band, NamedFlow, Result, Verification } from '~/solver/result'
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
  const banded = <Row extends { band?: Band[] }>(row: Row): Row =>
    row.band ? { ...row, band: only(row.band) } : row
  return {
    ...result,
    times: only(result.times),
    points: result.points.map((point) => banded({ ...point, head: only(point.head) })),
    wells: result.wells.map((well) =>
      banded({
        ...well,
        requested: only(well.requested),
        achieved: only(well.achieved),
        cellHead: only(well.cellHead),
        wellHead: only(well.wellHead),
      }),
    ),
    lines: result.lines.map((line) => banded({ ...line, discharge: only(line.discharge) })),
    rings: result.rings.map((ring) =>
      banded({
        ...ring,
        through: only(ring.through),
        recharge: only(ring.recharge),
        wells: only(ring.wells),
        leakage: only(ring.leakage),
        boundaries: only(ring.boundaries),
        storage: only(ring.storage),
        error: only(ring.error),
      }),
    ),
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
    ...(result.verification ? { verification: verificationAt(result.verification, only) } : {}),
  }
}

function verificationAt(
  verification: Verification,
  only: <Value>(values: readonly Value[]) => Value[],
): Verification {
  const { formula, results } = verification
  return {
    ...verification,
    formula: formula && {
      ...formula,
      results: formula.results.map((one) => ({
        ...one,
        formula: only(one.formula),
        difference: only(one.difference),
      })),
    },
    results: results.map((one) => ({
      ...one,
      band: only(one.band),
      order: only(one.order),
      extrapolated: only(one.extrapolated),
      how: only(one.how),
      gridError: only(one.gridError),
      ...(one.timeError ? { timeError: only(one.timeError) } : {}),
      swapped: one.swapped.map(({ text, values }) => ({ text, values: only(values) })),
    })),
  }
}

/**
 * Of a result at one moment: what the ground gives from storage or takes into it, as a flow in or out. It crosses no
 * edge, but in time the others add up only with it. None in steady flow.
 */
export function storageFlow({ times, balance }: Result): NamedFlow[] {
  if (times.length === 0) return []
  return [
    {
      name: 'storage',
      inflow: balance.storage.map((into) => Math.max(0, -into)),
      outflow: balance.storage.map((into) => Math.max(0, into)),
    },
  ]
}

/** All flows in and out of a result at one moment, storage with them. */
export function totalFlow(result: Result): NamedFlow {
  const [storage] = storageFlow(result)
  const { inflow, outflow } = result.balance
  return {
    name: 'Total',
    inflow: inflow.map((flow, k) => flow + (storage?.inflow[k] ?? 0)),
    outflow: outflow.map((flow, k) => flow + (storage?.outflow[k] ?? 0)),
  }
}

/** " at 30 d" for a result in time, '' for a steady one. */
export function momentInWords(result: Result, unit: string): string {
  const time = result.times.at(-1)
  return time === undefined ? '' : ` at ${formatNumber(time)} ${unit}`
}
