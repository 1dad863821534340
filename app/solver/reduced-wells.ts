import { solveDense } from './dense'
import { evaluate } from './flow'
import { type Balancing, balanceCells } from './newton'
import { clearance, logRadii, lowestLevelOf, mainCell, wellTransmissivity } from './well-heads'
import type { PlacedWell } from './wells'

/**
 * Reduces abstraction wells that stand below their lowest level until they stand on it. The response of the levels to
 * the rates comes from one solve a well on the system at hand; a few rounds settle what is not linear.
 */
export function reduceWells(run: Balancing): boolean {
  const { d, flow } = run
  const wells = d.wells
  const limited = new Set<number>()
  let response: number[][] = []
  let stale = true
  for (let round = 0; round < 40; round++) {
    const scale = (w: number) => {
      const well = wells[w] as PlacedWell
      const above = Math.abs(d.highestHead - lowestLevelOf(flow, well))
      return wellTransmissivity(flow, mainCell(well), d.highestHead) * Math.max(above, 1e-6)
    }
    const below = wells.map(
      (well, w) => clearance(flow, well, run.rates[w] as number, run.heads).above / scale(w),
    )
    for (const [w, well] of wells.entries()) {
      if (well.requested < 0 && !limited.has(w) && (below[w] as number) < -1e-9) {
        limited.add(w)
        stale = true
      }
    }
    const open = [...limited]
    const off = open.filter((w) => {
      const rate = run.rates[w] as number
      const gap = below[w] as number
      // A well that is off already and still too low, or back at its full rate and high enough, has settled.
      if (gap < -1e-8 && rate < 0) return true
      return gap > 1e-8 && rate > (wells[w] as PlacedWell).requested
    })
    if (off.length === 0) return true
    run.phase = 'wells that cannot give their rate'
    if (stale || !flow.linear) response = open.map((w) => responseOf(run, w, open))
    stale = false
    const wanted = open.map(
      (w) => -clearance(flow, wells[w] as PlacedWell, run.rates[w] as number, run.heads).above,
    )
    const changes = solveDense(
      open.map((_, a) => open.map((__, b) => (response[b] as number[])[a] as number)),
      wanted,
    )
    open.forEach((w, index) => {
      const requested = (wells[w] as PlacedWell).requested
      const next = (run.rates[w] as number) + (changes[index] as number)
      run.rates[w] = Math.min(0, Math.max(requested, next))
    })
    if (run.cancelled || !balanceCells(run)) return false
  }
  return false
}

/** Change of every limited well's clearance for one more unit of flow into the ground at well `source`. */
function responseOf(run: Balancing, source: number, open: number[]): number[] {
  const { d, flow, step } = run
  const unit = new Float64Array(d.active.length)
  for (const { cell, weight } of (d.wells[source] as PlacedWell).shares) {
    if ((d.fixedBy[cell] as number) < 0) unit[cell] = weight
  }
  if (step.stale || !flow.linear) {
    step.stale = true
    evaluate(flow, run.heads, run.rates, run.trial, run.matrix, run.storage)
  }
  const weight = run.matrix.weight.slice()
  const start = run.iterations
  const outcome = step.solve(run.matrix, unit, {
    target: 1e-8,
    headTolerance: 1e-6,
    mostIterations: run.mostIterations,
    watch: (iterations) => {
      run.iterations = start + iterations
      run.cancelled = run.watch.isCancelled?.() ?? false
      return run.cancelled
    },
  })
  run.iterations = start + outcome.iterations
  const rise = (cell: number) =>
    (wellTransmissivity(flow, cell, run.heads[cell] as number) * (step.y[cell] as number)) /
    (weight[cell] as number)
  return open.map((w) => {
    const well = d.wells[w] as PlacedWell
    const decides = clearance(flow, well, run.rates[w] as number, run.heads).cell
    if (decides >= 0) return rise(decides)
    const change = well.shares.reduce((sum, share) => sum + share.weight * rise(share.cell), 0)
    return change + (w === source ? logRadii(flow, well, run.heads) / (2 * Math.PI) : 0)
  })
}
