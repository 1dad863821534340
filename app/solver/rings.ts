import type { Discretised } from './discretise'
import { columnFaceCount, faceOf } from './faces'
import type { FlowField } from './flow-field'
import { checkLine, crossedFaces, placeLine } from './line-on-grid'
import type { Position } from './model'
import { ModelError } from './model-error'
import { checkedPolygon, visitCellsInside } from './polygon'

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

/** Discharge across each line, positive to its left: through the faces it separates and the outer faces along it. */
export function lineDischarges({ d, atFace, atOuterFaces }: FlowField): number[] {
  return (d.model.lines ?? []).map(({ line }) => {
    let discharge = 0
    for (const { face, share, left } of crossedFaces(d.grid, line, [true, true])) {
      discharge += left * share * atFace(face)
    }
    for (const { face, share, at } of placeLine(d.grid, d.active, line).faces) {
      const { axis, low } = faceOf(d.grid, face)
      const [a, b] = [line[at.segment] as Position, line[at.segment + 1] as Position]
      const highIsLeft = axis === 'x' ? b[1] < a[1] : b[0] > a[0]
      const lowActive = low >= 0 && d.active[low] === 1
      // Into the ground is towards the low cell where that one is active.
      const intoLeft = lowActive ? !highIsLeft : highIsLeft
      discharge += (intoLeft ? 1 : -1) * Math.min(1, share) * (atOuterFaces.get(face) ?? 0)
    }
    return discharge
  })
}

/** What a ring's cells gain: through + recharge + wells + leakage + boundaries = storage + error; volume/time. */
export interface RingFlows {
  through: number
  recharge: number
  wells: number
  leakage: number
  boundaries: number
  storage: number
}

/** Area of the cells inside each ring, in the model's length squared. */
export function ringAreas(d: Discretised): number[] {
  const { grid } = d
  return (d.model.rings ?? []).map((ring, index) => {
    let area = 0
    visitCellsInside(grid, checkedPolygon(ring.polygon, `rings[${index}].polygon`), (cell) => {
      const j = Math.floor(cell / grid.columns)
      const i = cell - j * grid.columns
      const height = (grid.yEdges[j + 1] as number) - (grid.yEdges[j] as number)
      const width = (grid.xEdges[i + 1] as number) - (grid.xEdges[i] as number)
      area += (d.active[cell] as number) * height * width
    })
    return area
  })
}

/** The flows of each ring. */
export function ringFlows(field: FlowField): RingFlows[] {
  const { d, atFace } = field
  const { grid } = d
  const split = columnFaceCount(grid)
  return (d.model.rings ?? []).map((ring, index) => {
    const inside = new Uint8Array(d.active.length)
    visitCellsInside(grid, checkedPolygon(ring.polygon, `rings[${index}].polygon`), (cell) => {
      inside[cell] = d.active[cell] as number
    })
    const flows = { through: 0, recharge: 0, wells: 0, leakage: 0, boundaries: 0, storage: 0 }
    for (let j = 0; j < grid.rows; j++) {
      for (let i = 0; i < grid.columns; i++) {
        const cell = j * grid.columns + i
        if (inside[cell] === 1) {
          flows.recharge += field.recharge[cell] as number
          flows.wells += field.wells[cell] as number
          flows.leakage += field.leakage[cell] as number
          flows.boundaries += field.boundaries[cell] as number
          flows.storage += field.storage[cell] as number
        }
        if (i > 0 && inside[cell] !== inside[cell - 1]) {
          const q = atFace(j * (grid.columns + 1) + i)
          flows.through += inside[cell] === 1 ? q : -q
        }
        if (j > 0 && inside[cell] !== inside[cell - grid.columns]) {
          const q = atFace(split + cell)
          flows.through += inside[cell] === 1 ? q : -q
        }
      }
    }
    return flows
  })
}
