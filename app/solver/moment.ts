import { addTo, type FlowField, type Tally } from './flow-field'
import { centresOf } from './grid'
import { lineDischarges, type RingFlows, ringFlows } from './rings'

/** What enters, leaves and is stored in the whole model: volume/time. */
export interface Totals {
  inflow: number
  outflow: number
  /** Into storage. */
  storage: number
}

/** The flows of one moment, or their mean over one step in time, as a result reports them: volume/time. */
export interface Moment extends Totals {
  boundaries: Tally[]
  leakage: Tally[]
  recharge: Tally[]
  /** Of each well, into the ground. */
  wells: number[]
  lines: number[]
  rings: RingFlows[]
  /** The cell that balances worst, its centre and what it gains too much. */
  worst: { at: [x: number, y: number]; error: number }
  /** Into the ground through outer faces, by face. */
  atOuterFaces: Map<number, number>
}

/** Adds up a flow field for the whole model. */
export function totalsOf(field: FlowField): Totals {
  const whole: Tally = { inflow: 0, outflow: 0 }
  for (const { inflow, outflow } of [...field.byBoundary, ...field.byLeakage]) {
    whole.inflow += inflow
    whole.outflow += outflow
  }
  for (const q of [...field.byRecharge, ...field.byWell]) addTo(whole, q)
  let storage = 0
  for (const rate of field.storage) storage += rate
  return { ...whole, storage }
}

/** Adds up a flow field by name, line and ring. */
export function momentOf(field: FlowField): Moment {
  return {
    ...totalsOf(field),
    boundaries: field.byBoundary,
    leakage: field.byLeakage,
    recharge: field.byRecharge.map(tallyOf),
    wells: field.byWell,
    lines: lineDischarges(field),
    rings: ringFlows(field),
    worst: worstCell(field),
    atOuterFaces: field.atOuterFaces,
  }
}

function worstCell({ d, error }: FlowField): Moment['worst'] {
  let worst = 0
  let most = -1
  for (let cell = 0; cell < error.length; cell++) {
    if (d.active[cell] !== 1 || Math.abs(error[cell] as number) <= most) continue
    most = Math.abs(error[cell] as number)
    worst = cell
  }
  const j = Math.floor(worst / d.grid.columns)
  const at: [number, number] = [
    centresOf(d.grid.xEdges)[worst - j * d.grid.columns] as number,
    centresOf(d.grid.yEdges)[j] as number,
  ]
  return { at, error: error[worst] as number }
}

function tallyOf(q: number): Tally {
  const tally: Tally = { inflow: 0, outflow: 0 }
  addTo(tally, q)
  return tally
}

/** a x one + b x other. */
export function weightedTotals(a: number, one: Totals, b: number, other: Totals): Totals {
  return {
    inflow: a * one.inflow + b * other.inflow,
    outflow: a * one.outflow + b * other.outflow,
    storage: a * one.storage + b * other.storage,
  }
}

/** a x one + b x other, entry by entry; the worst cell is the second's, where heads are reported. */
export function weighted(a: number, one: Moment, b: number, other: Moment): Moment {
  const mix = (p: number, q: number) => a * p + b * q
  const mixTallies = (p: Tally[], q: Tally[]) =>
    p.map((tally, k) => ({
      inflow: mix(tally.inflow, (q[k] as Tally).inflow),
      outflow: mix(tally.outflow, (q[k] as Tally).outflow),
    }))
  const mixNumbers = (p: number[], q: number[]) => p.map((value, k) => mix(value, q[k] as number))
  return {
    ...weightedTotals(a, one, b, other),
    boundaries: mixTallies(one.boundaries, other.boundaries),
    leakage: mixTallies(one.leakage, other.leakage),
    recharge: mixTallies(one.recharge, other.recharge),
    wells: mixNumbers(one.wells, other.wells),
    lines: mixNumbers(one.lines, other.lines),
    rings: one.rings.map((ring, k) => {
      const next = other.rings[k] as RingFlows
      return {
        through: mix(ring.through, next.through),
        recharge: mix(ring.recharge, next.recharge),
        wells: mix(ring.wells, next.wells),
        leakage: mix(ring.leakage, next.leakage),
        boundaries: mix(ring.boundaries, next.boundaries),
        storage: mix(ring.storage, next.storage),
      }
    }),
    worst: other.worst,
    atOuterFaces: other.atOuterFaces,
  }
}
