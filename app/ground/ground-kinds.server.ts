import type { RowKind } from '~/book/rows.server'
import {
  type Material,
  materialSchema,
  type Point,
  planImageSchema,
  pointSchema,
  type Zone,
  zoneSchema,
} from './ground'

/** The kinds of row of section 2. */
export const groundKinds: Record<string, RowKind> = {
  material: { section: 'ground', schema: materialSchema, label: (body: never) => (body as Material).name },
  zone: {
    section: 'ground',
    schema: zoneSchema,
    label: (body: never) => (body as Zone).name,
    refersTo: (body: never) => [{ field: 'materialId', id: (body as Zone).materialId }],
  },
  point: { section: 'ground', schema: pointSchema, label: (body: never) => (body as Point).name },
  'plan image': { section: 'ground', schema: planImageSchema, label: () => 'plan image' },
}
