import { convert, type Quantity } from '~/units'
import { carriesHead, type ReadingQuantity } from './reading'

/** A reference level as its history has it. */
export interface DatedLevel {
  from: string
  level: Quantity
  levelled: 'pipe top' | 'cover' | 'ground' | 'flange' | 'sensor'
}

/** A reading as it is stored: its value in metres, or none. */
export interface StoredReading {
  quantity: ReadingQuantity
  /** Milliseconds since 1970. */
  at: number
  value: number | null
  operator: string | null
  status: string | null
}

interface Step {
  from: number
  /** Metres above the vertical datum. */
  level: number
  source: DatedLevel
}

/** The history of one instrument's reference levels, made ready for many readings. */
export interface LevelHistory {
  /** What dips are measured from. */
  dip: Step[]
  /** Where the sensor hangs. */
  sensor: Step[]
}

export function levelHistory(levels: readonly DatedLevel[]): LevelHistory {
  const steps = levels
    .map((level) => ({ from: Date.parse(level.from), level: convert(level.level, 'm'), source: level }))
    .sort((a, b) => a.from - b.from)
  return {
    dip: steps.filter((step) => step.source.levelled !== 'sensor'),
    sensor: steps.filter((step) => step.source.levelled === 'sensor'),
  }
}

/** The reference level in force at an instant: the last one dated at or before it; undefined before the first. */
export function levelInForce(
  history: LevelHistory,
  quantity: ReadingQuantity,
  at: number,
): DatedLevel | undefined {
  return stepInForce(history, quantity, at)?.source
}

function stepInForce(history: LevelHistory, quantity: ReadingQuantity, at: number): Step | undefined {
  const steps = quantity === 'pressure head' ? history.sensor : history.dip
  return steps.findLast((step) => step.from <= at)
}

export type DerivedHead = { head: number; why: null } | { head: null; why: string }

/**
 * The head of a reading, in metres above the vertical datum: reference level in force less the dip; the level as it is;
 * the sensor's level plus the pressure head. A status such as "dry", and a value known only as a bound (< or >), give none.
 */
export function headOf(reading: StoredReading, history: LevelHistory): DerivedHead {
  if (!carriesHead(reading.status)) return { head: null, why: reading.status ?? '' }
  if (reading.value === null) return { head: null, why: 'no value' }
  if (reading.operator !== null) return { head: null, why: 'only a bound' }
  if (reading.quantity === 'level') return { head: reading.value, why: null }
  const step = stepInForce(history, reading.quantity, reading.at)
  if (!step) {
    return {
      head: null,
      why: reading.quantity === 'dip' ? 'no reference level in force' : 'no sensor level in force',
    }
  }
  return reading.quantity === 'dip'
    ? { head: step.level - reading.value, why: null }
    : { head: step.level + reading.value, why: null }
}
