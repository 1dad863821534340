import { addTo, type FlowField, type Tally } from './flow-field'
import { centresOf } from './grid'
import { lineDischarges, type RingFlows, ringFlows } from './rings'

/** The flows of one moment, or their mean over one step in time, as a result reports them: volume/time. */
export interface Moment {
  inflow: number
  outflow: number
  /** Into storage. */
  storage: number
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

/** Adds up a flow field by name, line and ring. */
export function momentOf(field: FlowField): Moment {
  const { d } = field
  const whole: Tally = { inflow: 0, outflow: 0 }
  const recharge = field.byRecharge.map((q) => tallyOf(q))
  for (const tally of [...field.byBoundary, ...field.byLeakage, ...recharge]) {
    whole.inflow += tally.inflow
    whole.outflow += tally.outflow
  }
  for (const q of field.byWell) addTo(whole, q)
  let storage = 0
  let worst = -1
  let most = -1
  for (let cell = 0; cell < field.error.length; cell++) {
    storage += field.storage[cell] as number
    const error = Math.abs(field.error[cell] as number)
    if (d.active[cell] === 1 && error > most) {
      most = error
      worst = cell
    }
  }
  const j = Math.floor(worst / d.grid.columns)
  return {
    ...whole,
    storage,
    boundaries: field.byBoundary,
    leakage: field.byLeakage,
    recharge,
    wells: field.byWell,
    lines: lineDischarges(field),
    rings: ringFlows(field),
    worst: {
      at: [
        centresOf(d.grid.xEdges)[worst - j * d.grid.columns] as number,
        centresOf(d.grid.yEdges)[j] as number,
      ],
      error: field.error[worst] as number,
    },
    atOuterFaces: field.atOuterFaces,
  }
}

function tallyOf(q: number): Tally {
  const tally: Tally = { inflow: 0, outflow: 0 }
  addTo(tally, q)
  return tally
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
    inflow: mix(one.inflow, other.inflow),
    outflow: mix(one.outflow, other.outflow),
    storage: mix(one.storage, other.storage),
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
