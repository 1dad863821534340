import { toCsv } from '~/components/spreadsheet'
import { downloadHeaders } from '~/files/files.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { findImport, rowsLeftOut } from '~/readings/imports.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/import-receipt'

/** The receipt of a committed import as CSV: the file and its hash, the counts, and every row that was not taken. */
export async function loader({ context, params }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'book')
  const db = database()
  const record = await findImport(db, project.id, idFrom(params.importId))
  if (!record?.receipt) throw notFound()
  const { receipt } = record
  const { counts } = receipt
  const rows = await rowsLeftOut(db, record)
  const csv = toCsv([
    ['Project', project.number],
    ['File', receipt.file.name],
    ['Bytes', receipt.file.bytes],
    ['SHA-256', receipt.file.sha256],
    ['Committed at (UTC)', receipt.committedAt],
    ['Committed by', receipt.committedBy],
    ['Undone at (UTC)', record.undoneAt?.toISOString() ?? ''],
    ['Undone by', record.undoneBy ?? ''],
    [],
    ['Rows in the file', counts.rows],
    ['Accepted', counts.accepted],
    ['Identical to what was there', counts.identical],
    ['Conflicts', counts.conflicts],
    ['of which taken as new revisions', receipt.superseded],
    ['Refused', counts.refused],
    ['Reason for new revisions', receipt.reason ?? ''],
    [],
    ['Instrument', 'Rows', 'First (UTC)', 'Last (UTC)'],
    ...receipt.instruments.map((one) => [one.name, one.rows, one.firstAt, one.lastAt]),
    [],
    ['Row of the file', 'Outcome', 'Entered', 'Why it added nothing'],
    ...rows.map((row) => [row.row, row.outcome, row.entered, row.reason]),
  ])
  const name = `receipt of ${receipt.file.name.replace(/\.\w+$/, '')}.csv`
  return new Response(csv, { headers: downloadHeaders({ name, content_type: 'text/csv; charset=utf-8' }) })
}
