import { frozenInput } from '~/heads/runs.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/run-model'

/** The model file that a run froze, in canonical form: its SHA-256 is the run's input hash. */
export async function loader({ context, params }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'book')
  const input = await frozenInput(database(), project.id, idFrom(params.runId))
  if (!input) throw notFound()
  return new Response(input.text, {
    headers: {
      'Content-Type': 'application/json; charset=utf-8',
      'Content-Disposition': `attachment; filename="run-${input.number}-model.json"`,
      'X-Content-Type-Options': 'nosniff',
      'Content-Security-Policy': "sandbox; default-src 'none'",
      'Cache-Control': 'private, no-cache',
      'Lavant-Input-SHA256': input.sha256,
    },
  })
}
