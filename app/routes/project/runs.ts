import { data } from 'react-router'
import { startRun } from '~/heads/runs.server'
import { permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/runs'

/**
 * POST a form with `caseId`: freezes the case and starts computing it. Answers 201 with the run (200 when the same
 * input is under way already), 400 with problems by section and row, 429 when too many wait.
 */
export async function action({ request, context }: Route.ActionArgs) {
  const { project, member } = permit(context, 'run', 'case')
  const caseId = (await request.formData()).get('caseId')
  if (typeof caseId !== 'string' || caseId === '')
    return data({ ok: false as const, reason: 'problems' as const, problems: [] }, { status: 400 })
  const answer = await startRun(database(), project, caseId, member.userId)
  if (answer.ok) return data(answer, { status: answer.alreadyUnderWay ? 200 : 201 })
  return answer.reason === 'too many'
    ? data(answer, { status: 429, headers: { 'Retry-After': '30' } })
    : data(answer, { status: 400 })
}
