import { findJob } from '~/jobs/jobs.server'
import { findPackage } from '~/packages/packages.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/package-state'

/** How far the drawing of a revision is; the page asks while it waits. */
export async function loader({ context, params }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'draft package')
  const row = await findPackage(database(), project.id, idFrom(params.packageId))
  if (!row) throw notFound()
  const job = row.job_id === null ? undefined : await findJob(row.job_id)
  return Response.json({
    status: row.status,
    drawing: job?.state === 'queued' || job?.state === 'running',
    failed: job?.state === 'failed' ? (job.error ?? 'The drawing failed.') : null,
    pdfSha256: row.pdf_sha256,
  })
}
