import { DataTable } from '~/components/data-table'
import { localTime } from '~/components/local-time'
import { PageTitle } from '~/components/page-title'
import { permit } from '~/projects/guard.server'
import { recentHistory } from '~/projects/history.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/history'

export async function loader({ context }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'history')
  const { minute } = localTime(project.timeZone)
  const lines = await recentHistory(database(), project.id)
  return {
    timeZone: project.timeZone,
    lines: lines.map(({ at, ...line }) => ({ ...line, at: minute(at.toISOString()) })),
  }
}

export default function History({ loaderData }: Route.ComponentProps) {
  return (
    <main id="work" className="min-w-0 flex-1 px-4 pt-5 pb-12 wide:px-6">
      <PageTitle title="History" />
      <p className="mb-4 max-w-prose text-flint-2">
        Who changed what, the newest first, in the time zone of the site. Nothing is ever taken out of it.
      </p>
      <DataTable
        caption="History"
        rows={loaderData.lines}
        rowKey={(line) => line.id}
        empty="Nothing has happened yet."
        columns={[
          {
            head: 'When',
            unit: loaderData.timeZone,
            cell: (line) => <span className="font-normal">{line.at}</span>,
          },
          { head: 'Who', words: true, cell: (line) => line.person ?? 'Lavant' },
          { head: 'Section', words: true, cell: (line) => line.section ?? '–' },
          { head: 'What', words: true, cell: (line) => line.action },
          { head: 'Of what', words: true, cell: (line) => line.subject },
          { head: 'Why', words: true, cell: (line) => line.reason ?? '–' },
        ]}
      />
    </main>
  )
}
