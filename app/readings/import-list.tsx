import { href, Link } from 'react-router'
import { DataTable } from '~/components/data-table'
import { localTime } from '~/components/local-time'
import { formatNumber } from '~/units'

export interface ImportLine {
  id: number
  file: string
  state: string
  createdAt: string
  createdBy: string
  rows: number | null
  accepted: number | null
  superseded: number
  refused: number | null
}

const stateWords: Record<string, string> = {
  uploaded: 'stored, not read yet',
  previewing: 'being read',
  previewed: 'read, not committed',
  committing: 'being stored',
  committed: 'in the book',
  undone: 'undone',
  failed: 'could not be read',
}

const stateLooks: Record<string, string> = {
  committed: 'text-moss',
  undone: 'text-flint-2',
  failed: 'text-madder',
  previewed: 'text-ochre',
  uploaded: 'text-ochre',
}

/** The imports of a project, each leading to its page: preview, receipt, undo. */
export function ImportList({
  imports,
  projectId,
  timeZone,
}: {
  imports: readonly ImportLine[]
  projectId: number
  timeZone: string
}) {
  const clock = localTime(timeZone)
  const count = (value: number | null) => (value === null ? '–' : formatNumber(value, 0))
  return (
    <DataTable
      caption="Imports"
      rows={[...imports]}
      rowKey={(row) => row.id}
      empty="No file has been imported yet."
      columns={[
        {
          head: 'File',
          words: true,
          cell: (row) => (
            <Link
              className="inline-block max-w-72 truncate align-bottom"
              to={href('/projects/:projectId/readings/imports/:importId', {
                projectId: String(projectId),
                importId: String(row.id),
              })}
            >
              {row.file}
            </Link>
          ),
        },
        {
          head: 'State',
          words: true,
          cell: (row) => (
            <span className={`whitespace-nowrap ${stateLooks[row.state] ?? ''}`}>
              {stateWords[row.state] ?? row.state}
            </span>
          ),
        },
        { head: 'Rows', cell: (row) => count(row.rows) },
        { head: 'Added', cell: (row) => count(row.accepted === null ? null : row.accepted + row.superseded) },
        { head: 'Refused', cell: (row) => count(row.refused) },
        { head: 'Stored', cell: (row) => clock.minute(row.createdAt) },
        {
          head: 'By',
          words: true,
          cell: (row) => <span className="whitespace-nowrap">{row.createdBy}</span>,
        },
      ]}
    />
  )
}
