import type { ZodType } from 'zod'
import { recordHistory } from '~/projects/history.server'
import type { Database } from '~database/connection.server'
import type { Row, RowChange, RowConflict, RowProblem, SaveAnswer } from './row'
import type { SectionKey } from './sections'
import { recordSection } from './sections.server'

/** What a section says of one of its kinds of row. */
export interface RowKind {
  section: SectionKey
  schema: ZodType
  /** What the history calls a row: its name, usually. */
  label: (body: never) => string
  /** What the section holds besides rows (imports, say), for its digest. */
  alsoHolds?: (db: Database, projectId: number) => Promise<unknown>
}

interface StoredRow {
  id: string
  version: number
  kind: string
  position: number
  body: unknown
  recorded_from: Date
  recorded_by_name: string
}

/** MariaDB keeps JSON as text; the driver may or may not have parsed it already. */
function parsed(body: unknown): unknown {
  return typeof body === 'string' ? JSON.parse(body) : body
}

/**
 * The rows of one kind in force, in the order of the sheet. With `asKnownOn`, the rows that were in force then.
 */
export async function listRows<Body>(
  db: Database,
  projectId: number,
  kind: string,
  asKnownOn?: Date,
): Promise<Row<Body>[]> {
  const query = db('book_rows')
    .join('users', 'users.id', 'book_rows.recorded_by')
    .where({ project_id: projectId, kind })
    .orderBy('position')
    .orderBy('recorded_from')
    .orderBy('book_rows.id')
    .select<StoredRow[]>(
      'book_rows.id',
      'version',
      'kind',
      'position',
      'body',
      'recorded_from',
      'users.name as recorded_by_name',
    )
  if (asKnownOn) {
    query
      .where('recorded_from', '<=', asKnownOn)
      .where((or) => or.whereNull('recorded_to').orWhere('recorded_to', '>', asKnownOn))
  } else {
    query.whereNull('recorded_to')
  }
  return (await query).map((row) => ({
    id: row.id,
    version: row.version,
    kind: row.kind,
    position: row.position,
    body: parsed(row.body) as Body,
    recordedFrom: row.recorded_from.toISOString(),
    recordedBy: row.recorded_by_name,
  }))
}

/** One row in force, or undefined. */
export async function findRow<Body>(
  db: Database,
  projectId: number,
  kind: string,
  id: string,
): Promise<Row<Body> | undefined> {
  return (await listRows<Body>(db, projectId, kind)).find((row) => row.id === id)
}

/**
 * Saves changes to controlled rows, all or none, in one transaction: a new version each, the history, and the digest
 * of every section touched. A row whose version has moved on comes back as a conflict with both values; a body that
 * its schema refuses comes back as a problem per field. Nothing is lost either way: the caller still has its changes.
 */
export async function saveRows(
  db: Database,
  options: {
    projectId: number
    userId: number
    changes: RowChange[]
    kinds: Record<string, RowKind>
    reason?: string
  },
): Promise<SaveAnswer> {
  const { projectId, userId, changes, kinds } = options
  const problems: RowProblem[] = []
  const bodies = new Map<RowChange, unknown>()
  for (const change of changes) {
    const kind = kinds[change.kind]
    if (!kind) {
      problems.push({
        id: change.id,
        field: '',
        message: `There is no kind of row called "${change.kind}" here.`,
      })
    } else if (change.op !== 'delete') {
      const body = kind.schema.safeParse(change.body)
      if (body.success) bodies.set(change, body.data)
      else {
        problems.push(
          ...body.error.issues.map((issue) => ({
            id: change.id,
            field: issue.path.join('.'),
            message: issue.message,
          })),
        )
      }
    }
  }
  if (problems.length > 0) return { ok: false, problems, conflicts: [] }

  return db.transaction(async (trx): Promise<SaveAnswer> => {
    const now = new Date()
    const conflicts: RowConflict[] = []
    const saved: { id: string; version: number }[] = []
    const current = await currentRows(trx, projectId, changes)
    for (const change of changes) {
      const theirs = current.get(change.id)
      const seen = change.op === 'add' ? undefined : change.version
      if (theirs?.version !== seen || (theirs && theirs.kind !== change.kind)) {
        conflicts.push({
          id: change.id,
          kind: change.kind,
          theirs: theirs
            ? {
                version: theirs.version,
                body: parsed(theirs.body),
                by: theirs.recorded_by_name,
                at: theirs.recorded_from.toISOString(),
              }
            : null,
          yours: change.op === 'delete' ? null : change.body,
        })
      }
    }
    if (conflicts.length > 0) return { ok: false, problems: [], conflicts }

    for (const change of changes) {
      const kind = kinds[change.kind]
      if (!kind) throw new Error(`Kind ${change.kind} passed the check above.`)
      const theirs = current.get(change.id)
      const body = bodies.get(change)
      if (theirs) {
        await trx('book_rows')
          .where({ project_id: projectId, id: change.id, version: theirs.version })
          .update({ recorded_to: now, ended_by: userId })
      }
      if (change.op !== 'delete') {
        const version = (await lastVersion(trx, projectId, change.id)) + 1
        await trx('book_rows').insert({
          project_id: projectId,
          id: change.id,
          version,
          section: kind.section,
          kind: change.kind,
          position: theirs?.position ?? (await nextPosition(trx, projectId, change.kind)),
          body: JSON.stringify(body),
          recorded_from: now,
          recorded_by: userId,
        })
        saved.push({ id: change.id, version })
      }
      const before = theirs && parsed(theirs.body)
      await recordHistory(trx, {
        projectId,
        userId,
        section: kind.section,
        action: `${change.op === 'add' ? 'added' : change.op === 'edit' ? 'changed' : 'deleted'} ${change.kind}`,
        subject: kind.label((body ?? before) as never),
        before,
        after: body,
        reason: options.reason,
      })
    }
    const touched = new Map(
      changes.map((change) => [kinds[change.kind]?.section, kinds[change.kind]?.alsoHolds] as const),
    )
    for (const [section, alsoHolds] of touched) {
      if (section) await recordRowSection(trx, { projectId, section, userId, alsoHolds })
    }
    return { ok: true, rows: saved }
  })
}

async function currentRows(
  trx: Database,
  projectId: number,
  changes: RowChange[],
): Promise<Map<string, StoredRow>> {
  const rows = await trx('book_rows')
    .join('users', 'users.id', 'book_rows.recorded_by')
    .where({ project_id: projectId })
    .whereIn(
      'book_rows.id',
      changes.map((change) => change.id),
    )
    .whereNull('recorded_to')
    .forUpdate()
    .select<StoredRow[]>(
      'book_rows.id',
      'version',
      'kind',
      'position',
      'body',
      'recorded_from',
      'users.name as recorded_by_name',
    )
  return new Map(rows.map((row) => [row.id, row]))
}

async function lastVersion(trx: Database, projectId: number, id: string): Promise<number> {
  const [row] = await trx('book_rows').where({ project_id: projectId, id }).max('version as last')
  return Number(row?.last ?? 0)
}

async function nextPosition(trx: Database, projectId: number, kind: string): Promise<number> {
  const [row] = await trx('book_rows').where({ project_id: projectId, kind }).max('position as last')
  return Number(row?.last ?? 0) + 1
}

/**
 * Records the digest of a section made of rows and, where it has them, other things; call it in the transaction of
 * the change.
 */
export async function recordRowSection(
  trx: Database,
  options: { projectId: number; section: SectionKey; userId: number; alsoHolds?: RowKind['alsoHolds'] },
): Promise<void> {
  const { projectId, section, userId, alsoHolds } = options
  const rows = await trx('book_rows')
    .where({ project_id: projectId, section })
    .whereNull('recorded_to')
    .orderBy('id')
    .select('id', 'version')
  const others = (await alsoHolds?.(trx, projectId)) ?? null
  const content = rows.length === 0 && others === null ? null : { rows, others }
  await recordSection(trx, projectId, section, content, userId)
}
