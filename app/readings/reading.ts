import { isUnitName, type UnitName, unitLabel, unitsOf } from '~/units'

/** What a reading measures, as the file has it. Heads are derived from it and never stored. */
export const quantities = ['dip', 'level', 'pressure head'] as const
export type ReadingQuantity = (typeof quantities)[number]

export const quantityWords: Record<ReadingQuantity, string> = {
  dip: 'dip below the reference level',
  level: 'level above the vertical datum',
  'pressure head': 'pressure head above the sensor',
}

/** Units that a quantity may be read in; a pressure counts as metres of water. */
export function unitsOfQuantity(quantity: ReadingQuantity): UnitName[] {
  const lengths = unitsOf('length').filter((unit) => unit !== 'km')
  return quantity === 'pressure head' ? [...lengths, ...unitsOf('pressure')] : lengths
}

export const qualities = ['raw', 'provisional', 'checked', 'rejected'] as const
export type Quality = (typeof qualities)[number]

/** A visit that gave no number, or a number with a caution, said in one of these words. Never numeric. */
export const statuses = [
  'dry',
  'flowing',
  'frozen',
  'obstructed',
  'pumping',
  'recently pumped',
  'not accessed',
  'damaged',
  'destroyed',
  'out of water',
  'below range',
  'estimated',
] as const
export type ReadingStatus = (typeof statuses)[number]

/** With these a number, where there is one, still stands for a head. */
const statusesWithHead: readonly ReadingStatus[] = ['pumping', 'recently pumped', 'estimated']

export function carriesHead(status: string | null): boolean {
  return status === null || statusesWithHead.some((word) => word === status)
}

const otherWords: Record<string, ReadingStatus> = {
  'dry hole': 'dry',
  'no water': 'dry',
  artesian: 'flowing',
  overflowing: 'flowing',
  flows: 'flowing',
  ice: 'frozen',
  blocked: 'obstructed',
  obstruction: 'obstructed',
  'being pumped': 'pumping',
  pumped: 'recently pumped',
  'no access': 'not accessed',
  'not accessible': 'not accessed',
  inaccessible: 'not accessed',
  'not read': 'not accessed',
  broken: 'damaged',
  lost: 'destroyed',
  'sensor dry': 'out of water',
  'under range': 'below range',
  est: 'estimated',
  'est.': 'estimated',
}

/** The status that a word of a file stands for, or null when it is no such word. */
export function readStatus(text: string): ReadingStatus | null {
  const word = text.trim().toLowerCase().replace(/\s+/g, ' ')
  return statuses.find((status) => status === word) ?? otherWords[word] ?? null
}

/** What a person wrote, as the file has it, with the column's unit behind a bare number. */
export function enteredText(reading: { entered: string; unit: string }): string {
  const { entered, unit } = reading
  return /[\d.,]$/.test(entered) && isUnitName(unit) ? `${entered} ${unitLabel(unit)}` : entered
}
