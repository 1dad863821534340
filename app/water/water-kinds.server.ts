import type { RowKind } from '~/book/rows.server'
import { boundarySchema, rechargeZoneSchema, wallSchema, wellSchema } from './water'

function named(body: never): string {
  return (body as { name: string }).name
}

/** The kinds of row of section 3. */
export const waterKinds: Record<string, RowKind> = {
  well: { section: 'water', schema: wellSchema, label: named },
  'recharge zone': { section: 'water', schema: rechargeZoneSchema, label: named },
  boundary: { section: 'water', schema: boundarySchema, label: named },
  wall: { section: 'water', schema: wallSchema, label: named },
}
