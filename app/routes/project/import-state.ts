import { findJob } from '~/jobs/jobs.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { findImport } from '~/readings/imports.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/import-state'

/** How far an import is: { state, progress, error }. Polled by its page while the import is busy. */
export async function loader({ context, params }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'book')
  const record = await findImport(database(), project.id, idFrom(params.importId))
  if (!record) throw notFound()
  const job = record.jobId === null ? undefined : await findJob(record.jobId)
  return Response.json(
    { state: record.state, progress: job?.progress ?? null, error: record.error },
    { headers: { 'Cache-Control': 'no-store' } },
  )
}
