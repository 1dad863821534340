import type { ZodType } from 'zod'
import { recordHistory } from '~/projects/history.server'
import type { Database } from '~database/connection.server'
import type { Row, RowChange, RowConflict, RowProblem, RowUse, SaveAnswer } from './row'
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
  /** Rows that a body points at: a zone at its material. They must be in the project, and stay while they are used. */
  refersTo?: (body: never) => RowReference[]
  /** The body without what it says of a row that goes: a case without its value for a well. None: the row must stay. */
  without?: (body: never, id: string) => unknown
  /**
   * What no single row shows: two rows of one name, a row deleted that readings rely on. Asked in the transaction of the
   * change, once it is made, about the changes of this kind; a problem takes all of it back.
   */
  check?: (trx: Database, projectId: number, changes: RowChange[]) => Promise<RowProblem[]>
}

/** Takes the transaction back. */
class Refused extends Error {
  constructor(readonly problems: RowProblem[]) {
    super('The rows of a section do not agree with each other.')
  }
}

export interface RowReference {
  /** Field that a message about the reference belongs to. */
  field: string
  id: string
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

/** Of book_rows joined with the users who recorded them. */
const storedColumns = [
  'book_rows.id',
  'version',
  'kind',
  'position',
  'body',
  'recorded_from',
  'users.name as recorded_by_name',
]

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
    .select<StoredRow[]>(storedColumns)
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
  const { changes, kinds } = options
  const problems: RowProblem[] = []
  const bodies = new Map<RowChange, unknown>()
  for (const change of changes) {
    // Its own only: every object has a "constructor" besides.
    const kind = Object.hasOwn(kinds, change.kind) ? kinds[change.kind] : undefined
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
  try {
    return await saveParsed(db, options, bodies)
  } catch (error) {
    if (error instanceof Refused) return { ok: false, problems: error.problems, conflicts: [] }
    throw error
  }
}

async function saveParsed(
  db: Database,
  options: Parameters<typeof saveRows>[1],
  bodies: Map<RowChange, unknown>,
): Promise<SaveAnswer> {
  const { projectId, userId, changes, kinds } = options
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

    const missing = await missingReferences(trx, projectId, changes, bodies, kinds)
    if (missing.length > 0) return { ok: false, problems: missing, conflicts: [] }
    const { released, held } = await releaseDeleted(trx, projectId, changes, kinds)
    if (held.length > 0) return { ok: false, problems: held, conflicts: [] }

    for (const { row, body } of released) {
      const kind = kinds[row.kind]
      if (!kind) throw new Error(`Kind ${row.kind} was found through its references.`)
      await trx('book_rows')
        .where({ project_id: projectId, id: row.id, version: row.version })
        .update({ recorded_to: now, ended_by: userId })
      await trx('book_rows').insert({
        project_id: projectId,
        id: row.id,
        version: row.version + 1,
        section: kind.section,
        kind: row.kind,
        position: row.position,
        body: JSON.stringify(body),
        recorded_from: now,
        recorded_by: userId,
      })
      await recordHistory(trx, {
        projectId,
        userId,
        section: kind.section,
        action: `changed ${row.kind}`,
        subject: kind.label(body as never),
        before: parsed(row.body),
        after: body,
        reason: options.reason ?? 'A row that it used was deleted.',
      })
    }
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
    for (const [name, kind] of Object.entries(kinds)) {
      const own = changes.filter((change) => change.kind === name)
      const disagreements = own.length > 0 ? ((await kind.check?.(trx, projectId, own)) ?? []) : []
      if (disagreements.length > 0) throw new Refused(disagreements)
    }
    const touched = new Set(
      [...changes, ...released.map(({ row }) => row)].map((one) => kinds[one.kind]?.section),
    )
    for (const section of touched) {
      const holding = Object.values(kinds).find((kind) => kind.section === section && kind.alsoHolds)
      if (section) {
        await recordRowSection(trx, { projectId, section, userId, alsoHolds: holding?.alsoHolds })
      }
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
    .select<StoredRow[]>(storedColumns)
  return new Map(rows.map((row) => [row.id, row]))
}

/** Rows in force of the kinds that point at other rows. */
async function referringRows(
  db: Database,
  projectId: number,
  kinds: Record<string, RowKind>,
): Promise<StoredRow[]> {
  const referring = Object.keys(kinds).filter((kind) => kinds[kind]?.refersTo)
  return db('book_rows')
    .where({ project_id: projectId })
    .whereIn('kind', referring)
    .whereNull('recorded_to')
    .select<StoredRow[]>('id', 'version', 'kind', 'position', 'body')
}

function referencesOf(kind: RowKind | undefined, body: unknown): RowReference[] {
  return kind?.refersTo?.(body as never) ?? []
}

/** References of the changed rows that lead nowhere: to another project, or to a row that somebody deleted. */
async function missingReferences(
  trx: Database,
  projectId: number,
  changes: RowChange[],
  bodies: Map<RowChange, unknown>,
  kinds: Record<string, RowKind>,
): Promise<RowProblem[]> {
  const wanted = changes.flatMap((change) =>
    change.op === 'delete'
      ? []
      : referencesOf(kinds[change.kind], bodies.get(change)).map((reference) => ({
          rowId: change.id,
          ...reference,
        })),
  )
  if (wanted.length === 0) return []
  const found = await trx('book_rows')
    .where({ project_id: projectId })
    .whereIn(
      'id',
      wanted.map((reference) => reference.id),
    )
    .whereNull('recorded_to')
    .pluck('id')
  const known = new Set<string>([...found, ...changes.filter((c) => c.op === 'add').map((c) => c.id)])
  for (const change of changes) if (change.op === 'delete') known.delete(change.id)
  return wanted
    .filter((reference) => !known.has(reference.id))
    .map(({ rowId, field }) => ({
      id: rowId,
      field,
      message: 'This refers to a row that is not in the book: choose another.',
    }))
}

/**
 * What a deletion does to the rows that use what is deleted: those that can do without, once the person has agreed,
 * and problems for those that cannot.
 */
async function releaseDeleted(
  trx: Database,
  projectId: number,
  changes: RowChange[],
  kinds: Record<string, RowKind>,
): Promise<{ released: { row: StoredRow; body: unknown }[]; held: RowProblem[] }> {
  const deleted = changes.filter((change) => change.op === 'delete')
  if (deleted.length === 0) return { released: [], held: [] }
  const changed = new Set(changes.map((change) => change.id))
  const released: { row: StoredRow; body: unknown }[] = []
  const held: RowProblem[] = []
  for (const row of await referringRows(trx, projectId, kinds)) {
    if (changed.has(row.id)) continue
    const kind = kinds[row.kind]
    let body = parsed(row.body)
    const before = body
    for (const change of deleted) {
      if (!kind || !referencesOf(kind, body).some((reference) => reference.id === change.id)) continue
      if (kind.without && change.alsoElsewhere) body = kind.without(body as never, change.id)
      else {
        const words = `${row.kind} ${kind.label(body as never)}`
        held.push({
          id: change.id,
          field: '',
          message: kind.without
            ? `Not deleted: ${words} uses it. Delete it again to take it out there too.`
            : `Not deleted: ${words} needs it. Choose another there first.`,
        })
      }
    }
    if (body !== before) released.push({ row, body })
  }
  return { released, held }
}

/** Which rows are used by others, by the id of the used row: what a page says before it deletes one. */
export async function listUses(
  db: Database,
  projectId: number,
  kinds: Record<string, RowKind>,
): Promise<Record<string, RowUse[]>> {
  const uses: Record<string, RowUse[]> = {}
  for (const row of await referringRows(db, projectId, kinds)) {
    const kind = kinds[row.kind]
    const body = parsed(row.body)
    const words = `${row.kind} ${kind?.label(body as never) ?? ''}`
    for (const id of new Set(referencesOf(kind, body).map((reference) => reference.id))) {
      const list = uses[id] ?? []
      list.push({ words, holds: kind?.without === undefined })
      uses[id] = list
    }
  }
  return uses
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
