import { findRun, runHeads } from '~/heads/runs.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/run-heads'

/** The head field of a run as one binary buffer, held against its SHA-256 before it leaves. */
export async function loader({ request, context, params }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'book')
  const db = database()
  const runId = idFrom(params.runId)
  const run = await findRun(db, project.id, runId)
  if (!run?.headsSha256) throw notFound()
  const headers = new Headers({
    'Content-Type': 'application/octet-stream',
    'Content-Disposition': `attachment; filename="run-${run.number}-heads.bin"`,
    'X-Content-Type-Options': 'nosniff',
    'Content-Security-Policy': "sandbox; default-src 'none'",
    // A run never changes, but whoever has left the project must be asked for again.
    'Cache-Control': 'private, no-cache',
    ETag: `"${run.headsSha256}"`,
    'Lavant-Heads-Format': String(run.headsFormat),
  })
  if (request.headers.get('if-none-match') === `"${run.headsSha256}"`)
    return new Response(null, { status: 304, headers })
  const heads = await runHeads(db, project.id, runId)
  if (!heads) throw notFound()
  return new Response(new Uint8Array(heads), { headers })
}
