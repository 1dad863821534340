import { relax, scaledSystem, slowestMode } from '../../app/solver/sor.ts'
import { type Measured, norm, relativeResidual, tolerance } from './measure.ts'
import type { Problem } from './problems.ts'

/** The reference method on the same problem, once: it takes long. Gives up after as many sweeps as take about 40 s. */
export function measureSor(problem: Problem): Measured {
  const { columns, rows, east, north, own, b } = problem
  const count = b.length
  const started = performance.now()
  const alongX = new Float64Array(count + 1)
  const alongY = new Float64Array(count + columns)
  alongX.set(east, 1)
  alongY.set(north, columns)
  const diag = new Float64Array(count)
  for (let c = 0; c < count; c++) {
    const links = (alongX[c] as number) + (east[c] as number) + (alongY[c] as number) + (north[c] as number)
    diag[c] = links + (own[c] as number)
  }
  const weight = new Float64Array(count).fill(1)
  const matrix = {
    diag,
    west: alongX.subarray(0, count),
    east: alongX.subarray(1),
    south: alongY.subarray(0, count),
    north: alongY.subarray(columns),
    own,
    corners: null,
    weight,
    symmetric: true,
  }
  const { lambda } = slowestMode(matrix, columns, rows)
  const system = scaledSystem(matrix, b, columns, rows)
  const ready = performance.now()
  const outcome = relax(system, {
    target: tolerance * norm(b),
    headTolerance: 1,
    lambda,
    zones: null,
    mostSweeps: 1e9,
    weight,
    watch: () => performance.now() - ready > 40_000,
  })
  const done = performance.now()
  const x = new Float64Array(count)
  for (let c = 0; c < count; c++) x[c] = (system.x[c + columns] as number) / (system.root[c] as number)
  return {
    setup: (ready - started) / 1000,
    solve: (done - ready) / 1000,
    iterations: outcome.sweeps,
    residual: relativeResidual(problem, x),
    ended: outcome.ended === 'sweeps' ? 'iterations' : outcome.ended,
    bytesPerCell: 8 * 9,
  }
}
