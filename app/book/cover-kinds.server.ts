import { coverSchema } from './cover'
import type { RowKind } from './rows.server'

/** The kind of row of section 0. */
export const coverKinds: Record<string, RowKind> = {
  cover: { section: 'cover', schema: coverSchema, label: () => 'cover' },
}
