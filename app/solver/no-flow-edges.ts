import type { Discretised } from './discretise'
import { facesOfCell } from './faces'
import { centresOf } from './grid'

/**
 * Names the edges without a boundary, where nothing flows: "north", "part of north", "hole at (x, y)", "part of the
 * hole at (x, y)". Ground that is missing beside the extent's edge counts as a hole.
 */
export function noFlowEdgesOf(d: Discretised): string[] {
  const { columns, rows } = d.grid
  const covered = new Map<number, number>()
  for (const entry of [...d.exchanges, ...d.specifiedFlows]) {
    if (entry.face >= 0) covered.set(entry.face, (covered.get(entry.face) ?? 0) + entry.width)
  }
  const hole = holesOf(d)
  const edges = new Map<string, { open: number; all: number }>()
  const xCentres = centresOf(d.grid.xEdges)
  const yCentres = centresOf(d.grid.yEdges)
  for (let cell = 0; cell < d.active.length; cell++) {
    if (d.active[cell] !== 1) continue
    const j = Math.floor(cell / columns)
    const i = cell - j * columns
    const beyond: [number, string][] = [
      [i > 0 ? cell - 1 : -1, 'west'],
      [i < columns - 1 ? cell + 1 : -1, 'east'],
      [j > 0 ? cell - columns : -1, 'south'],
      [j < rows - 1 ? cell + columns : -1, 'north'],
    ]
    const held = (d.fixedBy[cell] as number) >= 0
    const faces = facesOfCell(d.grid, cell)
    for (const [k, [next, side]] of beyond.entries()) {
      if (next >= 0 && d.active[next] === 1) continue
      const seed = next >= 0 ? (hole[next] as number) : -1
      const row = Math.floor(seed / columns)
      const name = seed < 0 ? side : `hole at (${xCentres[seed - row * columns]}, ${yCentres[row]})`
      const count = edges.get(name) ?? { open: 0, all: 0 }
      count.all++
      if (!held && !covered.has(faces[k as 0])) count.open++
      edges.set(name, count)
    }
  }
  const names: string[] = []
  for (const [name, { open, all }] of edges) {
    if (open === all) names.push(name)
    else if (open > 0) names.push(name.startsWith('hole') ? `part of the ${name}` : `part of ${name}`)
  }
  return names.sort()
}

/** For each cell without ground the first cell of the hole it belongs to. */
function holesOf(d: Discretised): Int32Array {
  const { columns, rows } = d.grid
  const hole = new Int32Array(d.active.length).fill(-1)
  const queue: number[] = []
  for (let seed = 0; seed < hole.length; seed++) {
    if (d.active[seed] === 1 || (hole[seed] as number) >= 0) continue
    hole[seed] = seed
    queue.push(seed)
    for (let cell = queue.pop(); cell !== undefined; cell = queue.pop()) {
      const i = cell % columns
      const j = (cell - i) / columns
      const around = [
        i > 0 ? cell - 1 : -1,
        i < columns - 1 ? cell + 1 : -1,
        j > 0 ? cell - columns : -1,
        j < rows - 1 ? cell + columns : -1,
      ]
      for (const next of around) {
        if (next < 0 || d.active[next] === 1 || (hole[next] as number) >= 0) continue
        hole[next] = seed
        queue.push(next)
      }
    }
  }
  return hole
}
