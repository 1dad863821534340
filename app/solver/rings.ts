import type { Discretised } from './discretise'
import { faceOf } from './faces'
import { type FaceFlow, type FlowModel, flowThrough } from './flow'
import { checkLine, crossedFaces, placeLine } from './line-on-grid'
import type { Position } from './model'
import { ModelError } from './model-error'
import { checkedPolygon, visitCellsInside } from './polygon'
import type { RingResult } from './result'

/** Flow into cells from outside the ground, by cell; what rings add up. All volume/time. */
export interface CellFlows {
  wells: Float64Array
  leakage: Float64Array
  boundaries: Float64Array
}

/** Refuses discharge lines and balance rings that have no clear meaning, before anything is solved. */
export function checkLinesAndRings(d: Discretised): void {
  for (const [index, line] of (d.model.lines ?? []).entries()) {
    checkLine(line.line, `lines[${index}].line`)
  }
  for (const [index, ring] of (d.model.rings ?? []).entries()) {
    const path = `rings[${index}].polygon`
    let inside = 0
    visitCellsInside(d.grid, checkedPolygon(ring.polygon, path), (cell) => {
      inside += d.active[cell] as number
    })
    if (inside === 0) throw new ModelError(path, `the ring "${ring.name}" holds no cell centre of the ground`)
  }
}

/** Flow through any face between two active cells, positive from its low to its high cell; 0 elsewhere. */
export function flowAtFace(flow: FlowModel, heads: Float64Array, face: number): number {
  const { d } = flow
  const { axis, low, high, length, lowHalf, highHalf } = faceOf(d.grid, face)
  if (low < 0 || high < 0 || d.active[low] !== 1 || d.active[high] !== 1) return 0
  const out: FaceFlow = { q: 0, byLow: 0, byHigh: 0 }
  flowThrough(flow, heads, face, axis, low, high, lowHalf, highHalf, length, out)
  return out.q
}

/** Discharge across each line, positive to its left: through the faces it separates and the outer faces along it. */
export function lineResults(
  flow: FlowModel,
  heads: Float64Array,
  inflow: Map<number, number>,
): { name: string; discharge: number[] }[] {
  const { d } = flow
  return (d.model.lines ?? []).map(({ name, line }) => {
    let discharge = 0
    for (const { face, share, left } of crossedFaces(d.grid, line, [true, true])) {
      discharge += left * share * flowAtFace(flow, heads, face)
    }
    for (const { face, share, at } of placeLine(d.grid, d.active, line).faces) {
      const { axis, low, length } = faceOf(d.grid, face)
      const [a, b] = [line[at.segment] as Position, line[at.segment + 1] as Position]
      const highIsLeft = axis === 'x' ? b[1] < a[1] : b[0] > a[0]
      const lowActive = low >= 0 && d.active[low] === 1
      // Into the ground is towards the low cell where that one is active.
      const intoLeft = lowActive ? !highIsLeft : highIsLeft
      const covered = Math.min(1, share)
      discharge += (intoLeft ? 1 : -1) * covered * (length > 0 ? (inflow.get(face) ?? 0) : 0)
    }
    return { name, discharge: [discharge] }
  })
}

/** The balance of each ring: through + recharge + wells + leakage + boundaries = storage + error, in positive. */
export function ringResults(flow: FlowModel, heads: Float64Array, flows: CellFlows): RingResult[] {
  const { d } = flow
  const { grid } = d
  return (d.model.rings ?? []).map((ring, index) => {
    const inside = new Uint8Array(d.active.length)
    visitCellsInside(grid, checkedPolygon(ring.polygon, `rings[${index}].polygon`), (cell) => {
      inside[cell] = d.active[cell] as number
    })
    let area = 0
    let through = 0
    let recharge = 0
    let wells = 0
    let leakage = 0
    let boundaries = 0
    for (let j = 0; j < grid.rows; j++) {
      const height = (grid.yEdges[j + 1] as number) - (grid.yEdges[j] as number)
      for (let i = 0; i < grid.columns; i++) {
        const cell = j * grid.columns + i
        if (inside[cell] === 1) {
          area += height * ((grid.xEdges[i + 1] as number) - (grid.xEdges[i] as number))
          recharge += d.recharge[cell] as number
          wells += flows.wells[cell] as number
          leakage += flows.leakage[cell] as number
          boundaries += flows.boundaries[cell] as number
        }
        if (i > 0 && inside[cell] !== inside[cell - 1]) {
          const q = flowAtFace(flow, heads, j * (grid.columns + 1) + i)
          through += inside[cell] === 1 ? q : -q
        }
        if (j > 0 && inside[cell] !== inside[cell - grid.columns]) {
          const q = flowAtFace(flow, heads, (grid.columns + 1) * grid.rows + cell)
          through += inside[cell] === 1 ? q : -q
        }
      }
    }
    return {
      name: ring.name,
      area,
      through: [through],
      recharge: [recharge],
      wells: [wells],
      leakage: [leakage],
      boundaries: [boundaries],
      storage: [0],
      error: [through + recharge + wells + leakage + boundaries],
    }
  })
}
