/** The sections of a calc book, in order, and what each is made from. The book itself knows no section's content. */
export const sections = [
  { number: 0, key: 'cover', title: 'Cover' },
  { number: 1, key: 'basis', title: 'Basis' },
  { number: 2, key: 'ground', title: 'Ground' },
  { number: 3, key: 'water', title: 'Water' },
  { number: 4, key: 'cases', title: 'Cases' },
  { number: 5, key: 'heads', title: 'Heads' },
  { number: 6, key: 'readings', title: 'Readings' },
  { number: 7, key: 'fit', title: 'Fit' },
  { number: 8, key: 'checks', title: 'Checks' },
  { number: 9, key: 'package', title: 'Package' },
] as const

export type SectionKey = (typeof sections)[number]['key']

export function isSectionKey(text: string): text is SectionKey {
  return sections.some((section) => section.key === text)
}

/** The sections that each one is computed from; a change in one of these reopens it. */
export const madeFrom: Record<SectionKey, readonly SectionKey[]> = {
  cover: [],
  basis: [],
  ground: [],
  water: ['ground'],
  cases: ['ground', 'water'],
  heads: ['ground', 'water', 'cases'],
  readings: [],
  fit: ['ground', 'water', 'cases', 'heads', 'readings'],
  checks: ['ground', 'water', 'cases', 'heads'],
  package: ['cover', 'basis', 'ground', 'water', 'cases', 'heads', 'readings', 'fit', 'checks'],
}

export type SectionState = 'empty' | 'drafted' | 'checked' | 'changed since check'

export interface SectionStatus {
  key: SectionKey
  state: SectionState
  /** Of what the section and those it is made from hold: a check says which it saw. */
  digest: string
  changedAt: Date | null
  checkedAt: Date | null
  checkedBy: string | null
}
