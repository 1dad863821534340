import { findModelSolve } from '~/heads/model-solves.server'
import { findSignedIn } from '~/sign-in/guard.server'
import type { Route } from './+types/job'

/** State of a solve that POST /api/v1/solve started, with its result once there is one. For its owner only. */
export async function loader({ request, params }: Route.LoaderArgs) {
  const headers = { 'Cache-Control': 'private, no-store' }
  const user = await findSignedIn(request)
  if (!user) {
    return Response.json(
      { errors: [{ path: null, message: 'You are signed out.' }] },
      { status: 401, headers },
    )
  }
  const solve = /^\d{1,9}$/.test(params.jobId)
    ? await findModelSolve(user.userId, Number(params.jobId))
    : undefined
  if (!solve) {
    const message = 'There is nothing here, or it is not yours to see.'
    return Response.json({ errors: [{ path: null, message }] }, { status: 404, headers })
  }
  return Response.json(solve, { headers })
}
