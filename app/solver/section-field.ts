import type { StorageTerm } from './flow'
import { addTo, emptyField, type FlowField, type Tally, throughOuter } from './flow-field'
import {
  netInflow,
  type SectionBalance,
  type SectionState,
  sectionFlowAtFace,
  sectionStored,
  termFlow,
} from './section-balance'

/** Every flow of one state of a vertical section with a free surface. */
export function sectionField(
  balance: SectionBalance,
  state: SectionState,
  storage: StorageTerm | null,
): FlowField {
  const { d, held, terms } = balance
  const { p, theta } = state
  const count = d.active.length
  const field = emptyField(d, (face) => sectionFlowAtFace(balance, state, face))
  netInflow(balance, state, storage, field.error)
  if (storage) {
    const stored = sectionStored(balance, state)
    for (let c = 0; c < count; c++) {
      field.storage[c] = ((stored[c] as number) - (storage.before[c] as number)) / storage.interval
    }
  }
  /** What a cell can give of an outflow asked for; inflows come whole. */
  const given = (cell: number, q: number) => (q < 0 ? q * (theta[cell] as number) : q)
  function atBoundary(index: number, cell: number, face: number, q: number): void {
    addTo(field.byBoundary[index] as Tally, q)
    field.boundaries[cell] = (field.boundaries[cell] as number) + q
    throughOuter(field, face, q)
  }
  field.byWell = d.wells.map(() => 0)
  function atWell(number: number, cell: number, q: number): void {
    field.wells[cell] = (field.wells[cell] as number) + q
    field.byWell[number] = (field.byWell[number] as number) + q
  }
  for (const term of terms) {
    const { exchange, well, cell, gravity } = term
    const q = termFlow(term, p[cell] as number).q - gravity * (theta[cell] as number)
    if (exchange) atBoundary(exchange.index, cell, exchange.face, q)
    else atWell(well, cell, q)
  }
  for (const { index, cell, face, rate } of d.specifiedFlows) {
    atBoundary(index, cell, face, given(cell, rate))
  }
  const limited = new Set(terms.map(({ well }) => well))
  for (const [number, well] of d.wells.entries()) {
    if (limited.has(number)) continue
    for (const { cell, weight } of well.shares) atWell(number, cell, given(cell, weight * well.requested))
  }
  for (let c = 0; c < count; c++) {
    if (d.active[c] !== 1 || Number.isNaN(held[c] as number)) continue
    atBoundary(d.fixedBy[c] as number, c, -1, -(field.error[c] as number))
    field.error[c] = 0
  }
  return field
}
