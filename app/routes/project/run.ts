import { data } from 'react-router'
import { cancelRun, runAgain, runStatus } from '~/heads/runs.server'
import { idFrom, notFound, permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/run'

/** State and progress of a run, for pages that poll it. */
export async function loader({ context, params }: Route.LoaderArgs) {
  const { project } = permit(context, 'view', 'book')
  const status = await runStatus(database(), project.id, idFrom(params.runId))
  if (!status) throw notFound()
  return Response.json(status, { headers: { 'Cache-Control': 'no-store' } })
}

/** POST a form with `intent`: `cancel` stops the run, `again` computes its frozen input once more as a new run. */
export async function action({ request, context, params }: Route.ActionArgs) {
  const { project, member } = permit(context, 'run', 'case')
  const runId = idFrom(params.runId)
  const db = database()
  const known = await runStatus(db, project.id, runId)
  if (!known) throw notFound()
  const intent = (await request.formData()).get('intent')
  if (intent === 'cancel')
    return data({ ok: true as const, cancelled: await cancelRun(db, project.id, runId) })
  if (intent === 'again') {
    const answer = await runAgain(db, project.id, runId, member.userId)
    if (!answer) throw notFound()
    if (answer.ok) return data(answer, { status: answer.alreadyUnderWay ? 200 : 201 })
    return data(answer, { status: 429, headers: { 'Retry-After': '30' } })
  }
  return data({ ok: false as const, reason: 'problems' as const, problems: [] }, { status: 400 })
}
