import { basisKinds } from './basis/basis-kinds.server'
import { coverKinds } from './book/cover-kinds.server'
import type { RowKind } from './book/rows.server'
import { casesKinds } from './cases/cases-kinds.server'
import { checkKinds } from './checks/check-kinds.server'
import { groundKinds } from './ground/ground-kinds.server'
import { readingKinds } from './readings/reading-kinds.server'
import { waterKinds } from './water/water-kinds.server'

/** Every kind of row of every section: what the one route that saves rows accepts. */
export const rowKinds: Record<string, RowKind> = {
  ...coverKinds,
  ...basisKinds,
  ...groundKinds,
  ...waterKinds,
  ...casesKinds,
  ...readingKinds,
  ...checkKinds,
}
