import type { RowChange, RowProblem } from '~/book/row'
import { listRows, type RowKind } from '~/book/rows.server'
import type { Database } from '~database/connection.server'
import { type Instrument, instrumentSchema, type ReferenceLevel, referenceLevelSchema } from './instrument'

/** The imports in force, by which the section's digest answers for the readings it holds. */
export async function committedImports(db: Database, projectId: number): Promise<unknown> {
  const rows = await db('imports')
    .join('files', 'files.id', 'imports.file_id')
    .where({ 'imports.project_id': projectId, 'imports.state': 'committed' })
    .orderBy('imports.id')
    .select('imports.id', 'files.sha256')
  return rows.length === 0 ? null : rows
}

/** Names tell instruments apart in files; an instrument that has readings can't go. */
async function checkInstruments(
  trx: Database,
  projectId: number,
  changes: RowChange[],
): Promise<RowProblem[]> {
  const problems: RowProblem[] = []
  const rows = await listRows<Instrument>(trx, projectId, 'instrument')
  const holders = new Map<string, string[]>()
  for (const { id, body } of rows) {
    const name = body.name.toLowerCase()
    holders.set(name, [...(holders.get(name) ?? []), id])
  }
  for (const change of changes) {
    if (change.op === 'delete') {
      const reading = await trx('readings')
        .where({ project_id: projectId, instrument_id: change.id })
        .first('import_id')
      if (reading) {
        problems.push({
          id: change.id,
          field: '',
          message:
            'This instrument has readings. Undo their imports first, or mark the instrument as out of service.',
        })
      }
      continue
    }
    const saved = rows.find((row) => row.id === change.id)
    if (saved && (holders.get(saved.body.name.toLowerCase())?.length ?? 0) > 1) {
      problems.push({
        id: change.id,
        field: 'name',
        message: `Another instrument is called ${saved.body.name}.`,
      })
    }
  }
  return problems
}

/** No two reference levels of one instrument, or two levels of its sensor, start at one instant. */
async function checkLevels(trx: Database, projectId: number, changes: RowChange[]): Promise<RowProblem[]> {
  const levels = await listRows<ReferenceLevel>(trx, projectId, 'reference level')
  const key = (level: ReferenceLevel) =>
    `${level.instrumentId} ${level.levelled === 'sensor'} ${Date.parse(level.from)}`
  return changes.flatMap((change) => {
    const saved = levels.find((row) => row.id === change.id)
    const twin = saved && levels.some((row) => row.id !== saved.id && key(row.body) === key(saved.body))
    if (!twin) return []
    const message = 'Another reference level of this instrument starts at the same instant.'
    return [{ id: change.id, field: 'from', message }]
  })
}

export const readingKinds: Record<string, RowKind> = {
  instrument: {
    section: 'readings',
    schema: instrumentSchema,
    label: (body: Instrument) => body.name,
    alsoHolds: committedImports,
    check: checkInstruments,
    refersTo: (body: Instrument) => (body.pointId ? [{ field: 'pointId', id: body.pointId }] : []),
    without: (body: Instrument) => ({ ...body, pointId: null }),
  },
  'reference level': {
    section: 'readings',
    schema: referenceLevelSchema,
    label: (body: ReferenceLevel) => `${body.levelled} from ${body.from.slice(0, 10)}`,
    alsoHolds: committedImports,
    check: checkLevels,
    refersTo: (body: ReferenceLevel) => [{ field: 'instrumentId', id: body.instrumentId }],
  },
}
