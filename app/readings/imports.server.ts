import { Readable } from 'node:stream'
import type { RowChange } from '~/book/row'
import { listRows, recordRowSection, saveRows } from '~/book/rows.server'
import { environment } from '~/environment.server'
import { deleteObject, getObjectStream, putObject, recordFile } from '~/files/files.server'
import { cancelJob, enterJob, launchJob, openJobs } from '~/jobs/jobs.server'
import { recordHistory } from '~/projects/history.server'
import type { Project } from '~/projects/project'
import type { Database } from '~database/connection.server'
import { notText } from './file-format'
import { firstBytes } from './file-rows.server'
import type {
  ImportCounts,
  ImportPreview,
  ImportReceipt,
  ImportSettings,
  NewInstrument,
} from './import-settings'
import type { Instrument } from './instrument'
import { countOutcomes, type Progress, previewFile, settle, summarise } from './preview.server'
import { committedImports, readingKinds } from './reading-kinds.server'

export const uploadLimit = 200 * 1024 * 1024

export type ImportState =
  | 'uploaded'
  | 'previewing'
  | 'previewed'
  | 'committing'
  | 'committed'
  | 'undone'
  | 'failed'

export interface ImportRecord {
  id: number
  projectId: number
  jobId: number | null
  state: ImportState
  settings: ImportSettings | null
  preview: ImportPreview | null
  receipt: ImportReceipt | null
  error: string | null
  createdAt: Date
  createdBy: string
  committedAt: Date | null
  committedBy: string | null
  undoneAt: Date | null
  undoneBy: string | null
  file: { id: number; name: string; bytes: number; sha256: string; key: string }
}

/** The import can't be done as asked; the message says why, and nothing has changed. */
export class ImportRefused extends Error {}

interface StoredImport {
  id: number
  project_id: number
  job_id: number | null
  state: ImportState
  settings: unknown
  preview: unknown
  receipt: unknown
  error: string | null
  created_at: Date
  created_by_name: string
  committed_at: Date | null
  committed_by_name: string | null
  undone_at: Date | null
  undone_by_name: string | null
  file_id: number
  name: string
  bytes: number
  sha256: string
  s3_key: string
}

function json<Value>(value: unknown): Value | null {
  return (typeof value === 'string' ? JSON.parse(value) : value) as Value | null
}

function importsOf(db: Database, projectId: number) {
  return db('imports')
    .join('files', 'files.id', 'imports.file_id')
    .join('users as maker', 'maker.id', 'imports.created_by')
    .leftJoin('users as committer', 'committer.id', 'imports.committed_by')
    .leftJoin('users as undoer', 'undoer.id', 'imports.undone_by')
    .where('imports.project_id', projectId)
    .select<StoredImport[]>(
      'imports.*',
      'maker.name as created_by_name',
      'committer.name as committed_by_name',
      'undoer.name as undone_by_name',
      'files.name',
      'files.bytes',
      'files.sha256',
      'files.s3_key',
    )
}

function fromRow(row: StoredImport): ImportRecord {
  return {
    id: row.id,
    projectId: row.project_id,
    jobId: row.job_id,
    state: row.state,
    settings: json(row.settings),
    preview: json(row.preview),
    receipt: json(row.receipt),
    error: row.error,
    createdAt: row.created_at,
    createdBy: row.created_by_name,
    committedAt: row.committed_at,
    committedBy: row.committed_by_name,
    undoneAt: row.undone_at,
    undoneBy: row.undone_by_name,
    file: { id: row.file_id, name: row.name, bytes: Number(row.bytes), sha256: row.sha256, key: row.s3_key },
  }
}

/** The imports of a project, newest first. */
export async function listImports(db: Database, projectId: number): Promise<ImportRecord[]> {
  return (await importsOf(db, projectId).orderBy('imports.id', 'desc')).map(fromRow)
}

export async function findImport(
  db: Database,
  projectId: number,
  importId: number,
): Promise<ImportRecord | undefined> {
  const [row] = await importsOf(db, projectId).where('imports.id', importId)
  return row && fromRow(row)
}

/** Another import of the project in force that came from the same bytes. */
export async function sameFileCommitted(
  db: Database,
  record: ImportRecord,
): Promise<{ id: number; name: string; committedAt: Date } | undefined> {
  const row = await db('imports')
    .join('files', 'files.id', 'imports.file_id')
    .where({
      'imports.project_id': record.projectId,
      'imports.state': 'committed',
      'files.sha256': record.file.sha256,
    })
    .whereNot('imports.id', record.id)
    .orderBy('imports.id')
    .first('imports.id', 'files.name', 'imports.committed_at')
  return row && { id: row.id, name: row.name, committedAt: row.committed_at }
}

/** How the latest import in force of a file with the same header was read. */
export async function settingsOfSameMake(
  db: Database,
  projectId: number,
  header: readonly string[],
): Promise<{ settings: ImportSettings; file: string; at: Date } | undefined> {
  if (header.length === 0) return undefined
  const imports = await importsOf(db, projectId)
    .where('imports.state', 'committed')
    .orderBy('imports.id', 'desc')
    .limit(50)
  const wanted = JSON.stringify(header)
  for (const record of imports.map(fromRow)) {
    if (record.settings && record.committedAt && JSON.stringify(record.settings.header) === wanted) {
      return { settings: record.settings, file: record.file.name, at: record.committedAt }
    }
  }
  return undefined
}

/**
 * Stores an uploaded file unchanged and opens an import for it. Returns the import's id.
 * Throws TooLarge past 200 MB and ImportRefused for an empty file or one that is no text; nothing stays behind then.
 */
export async function openImport(
  db: Database,
  upload: { projectId: number; userId: number; name: string; body: Readable },
): Promise<number> {
  const { projectId, userId, name } = upload
  const contentType = 'text/csv'
  const stored = await putObject(upload.body, {
    folder: `projects/${projectId}/readings`,
    contentType,
    limit: uploadLimit,
  })
  const problem =
    stored.bytes === 0
      ? 'The file is empty.'
      : notText(await firstBytes(await getObjectStream(stored.key), 4096))
  if (problem) {
    await deleteObject(stored.key)
    throw new ImportRefused(problem)
  }
  return db.transaction(async (trx) => {
    const fileId = await recordFile(trx, { projectId, kind: 'readings', name, contentType, stored, userId })
    const [importId] = await trx('imports').insert({
      project_id: projectId,
      file_id: fileId,
      state: 'uploaded',
      created_at: new Date(),
      created_by: userId,
    })
    if (importId === undefined) throw new Error('The database returned no import id.')
    await recordHistory(trx, {
      projectId,
      userId,
      section: 'readings',
      action: 'uploaded readings',
      subject: name,
      after: { import: importId, sha256: stored.sha256, bytes: stored.bytes },
    })
    return importId
  })
}

const open: ImportState[] = ['uploaded', 'previewed', 'failed']

/** Takes the import over into a busy state. Throws ImportRefused when somebody else has it in hand. */
async function take(
  db: Database,
  record: ImportRecord,
  from: ImportState[],
  values: Record<string, unknown>,
): Promise<void> {
  const taken = await db('imports')
    .where({ id: record.id, project_id: record.projectId })
    .whereIn('state', from)
    .update({ error: null, ...values })
  if (taken === 0) {
    throw new ImportRefused(
      'This import has moved on meanwhile: the page shows how it stands now. Nothing was changed.',
    )
  }
}

/** Starts reading the file on a thread; the import's state tells when it is done. Throws ImportRefused. */
export async function startPreview(
  db: Database,
  request: {
    project: Pick<Project, 'id' | 'timeZone' | 'units'>
    userId: number
    record: ImportRecord
    settings: ImportSettings
  },
): Promise<number> {
  const { project, userId, record, settings } = request
  const jobId = await db.transaction(async (trx) => {
    await refuseThird(trx, userId)
    const id = await enterJob(trx, { projectId: project.id, userId, kind: 'import' })
    await take(trx, record, open, {
      state: 'previewing',
      settings: JSON.stringify(settings),
      preview: null,
      job_id: id,
    })
    return id
  })
  launchJob<{ preview: ImportPreview }>(jobId, {
    projectId: project.id,
    userId,
    kind: 'import',
    workerData: {
      task: 'preview',
      database: environment().database,
      project: { id: project.id, timeZone: project.timeZone, units: project.units },
      importId: record.id,
      file: { key: record.file.key, bytes: record.file.bytes },
      settings,
    },
    onDone: async ({ preview }) => {
      await db('imports')
        .where({ id: record.id, state: 'previewing' })
        .update({ state: 'previewed', preview: JSON.stringify(preview) })
    },
    onEnd: async (state, error) => {
      await db('imports')
        .where({ id: record.id, state: 'previewing' })
        .update({
          state: state === 'cancelled' ? 'uploaded' : 'failed',
          error: error?.slice(0, 2000) ?? null,
        })
    },
  })
  return jobId
}

export interface CommitOrder {
  /** What becomes of rows that contradict a reading: it stays, or a new revision takes its place. */
  conflicts: 'keep' | 'take new'
  /** Needed to take new ones. */
  reason: string | null
  /** The counts the person saw; when they are no longer true, nothing is committed. */
  counts: ImportCounts
}

/** Imports that one person may have under way at a time, so that others get a thread too. */
const openImportsPerPerson = 2

async function refuseThird(db: Database, userId: number): Promise<void> {
  if ((await openJobs(db, userId, 'import')) < openImportsPerPerson) return
  throw new ImportRefused(
    `You have ${openImportsPerPerson} imports under way already: wait for one, or stop one.`,
  )
}

/** Starts the commit on a thread. Throws ImportRefused. */
export async function startCommit(
  db: Database,
  request: { project: Pick<Project, 'id'>; userId: number; record: ImportRecord; order: CommitOrder },
): Promise<number> {
  const { project, userId, record, order } = request
  const jobId = await db.transaction(async (trx) => {
    await refuseThird(trx, userId)
    const id = await enterJob(trx, { projectId: project.id, userId, kind: 'import' })
    await take(trx, record, ['previewed'], { state: 'committing', job_id: id })
    return id
  })
  launchJob(jobId, {
    projectId: project.id,
    userId,
    kind: 'import',
    workerData: {
      task: 'commit',
      database: environment().database,
      project: { id: project.id },
      userId,
      importId: record.id,
      order,
    },
    onDone: async () => {},
    onEnd: async (_state, error) => {
      await db('imports')
        .where({ id: record.id, state: 'committing' })
        .update({ state: 'previewed', error: error?.slice(0, 2000) ?? null })
    },
  })
  return jobId
}

const chunk = 20_000

/**
 * One change of a project's readings after another: two must not both find the same key free. A lock by name on a
 * connection of its own: row locks would hold up everybody who saves a row of the project, for as long as a commit takes.
 */
async function inTurn<Answer>(
  db: Database,
  projectId: number,
  work: (trx: Database) => Promise<Answer>,
): Promise<Answer> {
  // Within a transaction of the caller there is one connection, and its end is the caller's to order.
  if (db.isTransaction) return db.transaction(work)
  return db.transaction(async (holder) => {
    const name = `lavant readings ${projectId}`
    const [[got]] = await holder.raw('select get_lock(concat(database(), ?), 1800) as got', [name])
    if (got.got !== 1)
      throw new ImportRefused('Another import of this project takes too long: try again later.')
    try {
      return await db.transaction(work)
    } finally {
      await holder.raw('do release_lock(concat(database(), ?))', [name])
    }
  })
}

/**
 * Commits a previewed import in one transaction: new instruments, readings, receipt, history and the section's digest.
 * Throws ImportRefused when the preview no longer holds, or an instrument can't be added; nothing has changed then.
 */
export async function commitImport(
  db: Database,
  commit: {
    projectId: number
    userId: number
    importId: number
    order: CommitOrder
    report?: (progress: Progress) => void
  },
): Promise<ImportReceipt> {
  const { projectId, userId, importId, order } = commit
  if (order.conflicts === 'take new' && !order.reason?.trim()) {
    throw new ImportRefused('Give the reason why the new values take the place of the old ones.')
  }
  return inTurn(db, projectId, async (trx) => {
    const record = await findImport(trx, projectId, importId)
    if (!record?.preview || !['previewed', 'committing'].includes(record.state)) {
      throw new ImportRefused('There is no preview to commit: read the file again.')
    }
    const { preview } = record
    if (preview.question) throw new ImportRefused(`Choose the ${preview.question} first.`)
    await settle(trx, importId)
    const { counts } = await countOutcomes(trx, importId)
    if (JSON.stringify(counts) !== JSON.stringify(order.counts)) {
      throw new ImportRefused(
        'Readings or instruments changed since this preview: read the file again and look at the new counts.',
      )
    }
    await addInstruments(trx, { projectId, userId, file: record.file.name, added: preview.newInstruments })
    const instruments = await listRows<Instrument>(trx, projectId, 'instrument')
    await refuseStrays(trx, importId, new Set(instruments.map((row) => row.id)))

    await insertReadings(trx, { importId, rows: counts.rows, report: commit.report })
    const superseded = order.conflicts === 'take new' ? await supersede(trx, importId) : 0
    const now = new Date()
    const user = await trx('users').where({ id: userId }).first('name')
    const receipt: ImportReceipt = {
      file: { name: record.file.name, bytes: record.file.bytes, sha256: record.file.sha256 },
      counts,
      superseded,
      conflictRule: order.conflicts,
      reason: order.reason?.trim() || null,
      instruments: await summarise(
        trx,
        importId,
        instruments.map((row) => ({ id: row.id, name: row.body.name })),
        preview.newInstruments,
      ),
      addedInstruments: preview.newInstruments.map(({ id, name }) => ({ id, name })),
      reasons: preview.reasons,
      committedAt: now.toISOString(),
      committedBy: user?.name ?? '',
    }
    // What was refused stays for the receipt; what was accepted now stands among the readings.
    await trx('reading_staging').where({ import_id: importId, outcome: 'accepted' }).delete()
    await trx('imports')
      .where({ id: importId })
      .update({
        state: 'committed',
        receipt: JSON.stringify(receipt),
        committed_at: now,
        committed_by: userId,
        error: null,
      })
    await recordHistory(trx, {
      projectId,
      userId,
      section: 'readings',
      action: 'imported readings',
      subject: record.file.name,
      after: { import: importId, sha256: record.file.sha256, counts, superseded },
      reason: receipt.reason ?? undefined,
    })
    await recordRowSection(trx, { projectId, section: 'readings', userId, alsoHolds: committedImports })
    return receipt
  })
}

async function addInstruments(
  trx: Database,
  order: { projectId: number; userId: number; file: string; added: NewInstrument[] },
): Promise<void> {
  if (order.added.length === 0) return
  const changes: RowChange[] = order.added.map(({ id, name, kind, x, y }) => ({
    op: 'add',
    kind: 'instrument',
    id,
    body: { name, kind, x, y, source: order.file },
  }))
  const answer = await saveRows(trx, {
    projectId: order.projectId,
    userId: order.userId,
    changes,
    kinds: readingKinds,
    reason: `Import of ${order.file}`,
  })
  if (answer.ok) return
  const problem = answer.problems[0]
  const name = order.added.find((added) => added.id === problem?.id)?.name
  throw new ImportRefused(
    `The new instrument ${name ?? ''} can't be added: ${problem?.message ?? 'somebody added it meanwhile.'}`,
  )
}

/** An instrument deleted since the preview takes its rows with it: say so rather than store readings of nothing. */
async function refuseStrays(trx: Database, importId: number, known: Set<string>): Promise<void> {
  const staged = await trx('reading_staging')
    .where({ import_id: importId })
    .whereNotNull('instrument_id')
    .distinct<{ instrument_id: string }[]>('instrument_id')
  if (staged.some(({ instrument_id }) => !known.has(instrument_id))) {
    throw new ImportRefused('An instrument of this preview was deleted meanwhile: read the file again.')
  }
}

const columns = `project_id, instrument_id, quantity, taken_at, revision, value, entered, unit, operator, status, quality,
  import_id, file_row`

/** Moves accepted rows over, piece by piece within the transaction, so that progress can be shown. */
async function insertReadings(
  trx: Database,
  order: { importId: number; rows: number; report?: (progress: Progress) => void },
): Promise<void> {
  const [range] = await trx('reading_staging')
    .where({ import_id: order.importId, outcome: 'accepted' })
    .min('file_row as first')
    .max('file_row as last')
  if (range?.first === null || range?.first === undefined) return
  const last = Number(range.last)
  for (let from = Number(range.first); from <= last; from += chunk) {
    await trx.raw(
      `insert into readings (${columns})
       select project_id, instrument_id, quantity, taken_at, 1, value, entered, unit, operator, status, 'raw', import_id, file_row
       from reading_staging
       where import_id = ? and outcome = 'accepted' and file_row between ? and ?`,
      [order.importId, from, from + chunk - 1],
    )
    const percent = Math.min(95, Math.round(((from + chunk) / last) * 95))
    order.report?.({ step: 'storing', rows: order.rows, percent })
  }
}

/** Stores conflicting rows as the next revision of their reading; the one before stays, and comes back at undo. */
async function supersede(trx: Database, importId: number): Promise<number> {
  const [result] = await trx.raw(
    `insert into readings (${columns})
     select s.project_id, s.instrument_id, s.quantity, s.taken_at,
       (select max(m.revision) + 1 from readings m
         where m.project_id = s.project_id and m.instrument_id = s.instrument_id and m.quantity = s.quantity and m.taken_at = s.taken_at),
       s.value, s.entered, s.unit, s.operator, s.status, 'raw', s.import_id, s.file_row
     from reading_staging s where s.import_id = ? and s.outcome = 'conflict'`,
    [importId],
  )
  return Number(result.affectedRows)
}

/**
 * Takes a whole import back: its readings go, revisions that it superseded come back, and instruments that it added go
 * unless something else relies on them by now. The file and the receipt stay. Throws ImportRefused.
 */
export async function undoImport(
  db: Database,
  undo: { projectId: number; userId: number; importId: number },
): Promise<{ removed: number; keptInstruments: string[] }> {
  const { projectId, userId, importId } = undo
  return inTurn(db, projectId, async (trx) => {
    const record = await findImport(trx, projectId, importId)
    if (record?.state !== 'committed' || !record.receipt) {
      throw new ImportRefused('This import is not in force: there is nothing to undo.')
    }
    const removed = await trx('readings').where({ project_id: projectId, import_id: importId }).delete()
    await trx('imports')
      .where({ id: importId })
      .update({ state: 'undone', undone_at: new Date(), undone_by: userId })
    const keptInstruments = await removeAdded(trx, { projectId, userId, record })
    await recordHistory(trx, {
      projectId,
      userId,
      section: 'readings',
      action: 'undid import of readings',
      subject: record.file.name,
      before: { import: importId, counts: record.receipt.counts },
      after: { removed, keptInstruments },
    })
    await recordRowSection(trx, { projectId, section: 'readings', userId, alsoHolds: committedImports })
    return { removed, keptInstruments }
  })
}

/** Deletes instruments that the import added and nobody touched since. Returns the names of those that stay. */
async function removeAdded(
  trx: Database,
  order: { projectId: number; userId: number; record: ImportRecord },
): Promise<string[]> {
  const { projectId, userId, record } = order
  const added = new Set(record.receipt?.addedInstruments.map(({ id }) => id))
  if (added.size === 0) return []
  const rows = (await listRows<Instrument>(trx, projectId, 'instrument')).filter((row) => added.has(row.id))
  const levels = await listRows<{ instrumentId: string }>(trx, projectId, 'reference level')
  const reliedOn = new Set(levels.map((row) => row.body.instrumentId))
  const others = await trx('readings')
    .where({ project_id: projectId })
    .whereIn('instrument_id', [...added])
    .distinct<{ instrument_id: string }[]>('instrument_id')
  for (const { instrument_id } of others) reliedOn.add(instrument_id)
  const stays = (row: (typeof rows)[number]) => row.version > 1 || reliedOn.has(row.id)
  const changes: RowChange[] = rows
    .filter((row) => !stays(row))
    .map((row) => ({ op: 'delete', kind: 'instrument', id: row.id, version: row.version }))
  if (changes.length > 0) {
    const reason = `Undone import of ${record.file.name}`
    const answer = await saveRows(trx, { projectId, userId, changes, kinds: readingKinds, reason })
    if (!answer.ok) throw new ImportRefused('An instrument of this import is in use: nothing was undone.')
  }
  return rows.filter(stays).map((row) => row.body.name)
}

/** Throws an upload away that was never committed, file and all. Throws ImportRefused. */
export async function discardImport(
  db: Database,
  discard: { projectId: number; userId: number; importId: number },
): Promise<void> {
  const { projectId, userId, importId } = discard
  const key = await db.transaction(async (trx) => {
    const record = await findImport(trx, projectId, importId)
    const gone = record
      ? await trx('imports').where({ id: importId, project_id: projectId }).whereIn('state', open).delete()
      : 0
    if (!record || gone === 0) {
      throw new ImportRefused('Only an import that is neither running nor committed can be discarded.')
    }
    await trx('reading_staging').where({ import_id: importId }).delete()
    await trx('files').where({ id: record.file.id, project_id: projectId }).delete()
    await recordHistory(trx, {
      projectId,
      userId,
      section: 'readings',
      action: 'discarded upload',
      subject: record.file.name,
      before: { import: importId, sha256: record.file.sha256, bytes: record.file.bytes },
    })
    return record.file.key
  })
  await deleteObject(key)
}

/** Stops a preview that is running. */
export async function stopPreview(record: ImportRecord): Promise<void> {
  if (record.state === 'previewing' && record.jobId !== null) await cancelJob(record.jobId)
}

/** Rows of an import that were not taken, each with its reason; null instrument where none was recognised. */
export async function rowsLeftOut(
  db: Database,
  record: ImportRecord,
): Promise<{ row: number; outcome: string; entered: string; reason: string }[]> {
  const rows = await db('reading_staging')
    .where({ import_id: record.id, project_id: record.projectId })
    .whereIn('outcome', ['refused', 'conflict', 'identical', 'repeated'])
    .orderBy('file_row')
    .select<{ file_row: number; outcome: string; entered: string | null; refusal: string | null }[]>(
      'file_row',
      'outcome',
      'entered',
      'refusal',
    )
  const superseded = record.receipt?.conflictRule === 'take new'
  const words: Record<string, string> = {
    identical: 'Already there with the same value.',
    repeated: 'Repeats an earlier row of this file.',
    conflict: superseded
      ? 'Another value was there: taken as a new revision.'
      : 'Another value was there: it was kept.',
  }
  return rows.map((row) => ({
    row: row.file_row,
    outcome: row.outcome,
    entered: row.entered ?? '',
    reason: row.refusal ?? words[row.outcome] ?? '',
  }))
}

/**
 * Takes a file of readings all the way in, in this process: stores it, reads it, commits it. For seeds and tests; the same
 * code as the pages run. Throws what its parts throw.
 */
export async function importFile(
  db: Database,
  file: {
    project: Pick<Project, 'id' | 'timeZone' | 'units'>
    userId: number
    name: string
    content: string | Buffer
    settings: ImportSettings
    order?: { conflicts: 'keep' | 'take new'; reason: string | null }
    now?: Date
  },
): Promise<{ importId: number; receipt: ImportReceipt }> {
  const { project, userId, settings } = file
  const body = Readable.from([Buffer.from(file.content)])
  const importId = await openImport(db, { projectId: project.id, userId, name: file.name, body })
  const record = await findImport(db, project.id, importId)
  if (!record) throw new Error('The import just opened is gone.')
  const preview = await previewFile(db, {
    importId,
    project,
    file: record.file,
    settings,
    now: file.now ?? new Date(),
    report: () => {},
    stopped: () => false,
  })
  await db('imports')
    .where({ id: importId })
    .update({ state: 'previewed', settings: JSON.stringify(settings), preview: JSON.stringify(preview) })
  const order = { conflicts: 'keep' as const, reason: null, ...file.order, counts: preview.counts }
  const receipt = await commitImport(db, { projectId: project.id, userId, importId, order })
  return { importId, receipt }
}
