import { mostCells } from '~/cases/case'
import { cellCount } from '~/cases/cell-count'
import { parseModelFile } from '~/cases/model-file'
import { findModelSolve, forgetOldModelSolves, startModelSolve } from '~/heads/model-solves.server'
import { jobEnded } from '~/jobs/jobs.server'
import { limitedText, parseJson } from '~/json-body.server'
import { findSignedIn, requireSameOrigin } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/solve'

const largestBody = 8 * 1024 * 1024
/** Longer solves answer with the address of their job. A caller may ask for less: `Prefer: wait=5` (RFC 7240). */
const longestWaitSeconds = 20

/**
 * POST a model file: 200 with its result, or 202 with the job's address once that takes longer than 20 seconds.
 * 400 what is no model file, 413 too large, 415 not JSON, 422 a model that cannot be computed (with the path in it),
 * 429 too many under way.
 */
export async function action({ request }: Route.ActionArgs) {
  if (request.method !== 'POST') return refuse(405, null, 'Send a model file with POST.', { Allow: 'POST' })
  const db = database()
  const user = await findSignedIn(request)
  if (!user) return refuse(401, null, 'You are signed out.')
  requireSameOrigin(request)
  const type = request.headers.get('content-type')?.split(';')[0]?.trim().toLowerCase()
  if (type !== 'application/json') return refuse(415, null, 'Send the model file as application/json.')
  const text = await limitedText(request, largestBody)
  if (text === null) return refuse(413, null, 'A model file may have 8 MB at most.')

  const json = parseJson(text)
  if (json === undefined) return refuse(400, null, 'This is not JSON.')
  const parsed = parseModelFile(json)
  if (!parsed.ok) return Response.json({ errors: parsed.errors }, { status: 400, headers: privately })
  const cells = cellCount(parsed.model)
  if (cells > mostCells)
    return refuse(422, 'grid', `${cells} cells are too many: at most ${mostCells} are computed here.`)

  await forgetOldModelSolves(db)
  const jobId = await startModelSolve(db, user.userId, parsed.model)
  if (jobId === undefined)
    return refuse(429, null, 'You have two solves under way already.', { 'Retry-After': '30' })
  const ended = await within(jobEnded(jobId), waitSeconds(request))
  const address = `/api/v1/jobs/${jobId}`
  const solve = await findModelSolve(user.userId, jobId)
  if (!ended || !solve) {
    return Response.json(
      { job: jobId, state: solve?.state ?? 'queued', address },
      { status: 202, headers: { ...privately, Location: address, 'Retry-After': '2' } },
    )
  }
  if (solve.result) return Response.json(solve.result, { headers: privately })
  // A refusal names a place in the model; whatever else went wrong is no fault of the model.
  return refuse(
    solve.error?.path != null ? 422 : 500,
    solve.error?.path ?? null,
    solve.error?.message ?? 'It failed.',
  )
}

export function loader() {
  return refuse(405, null, 'Send a model file with POST.', { Allow: 'POST' })
}

const privately = { 'Cache-Control': 'private, no-store' }

function refuse(status: number, path: string | null, message: string, headers: Record<string, string> = {}) {
  return Response.json({ errors: [{ path, message }] }, { status, headers: { ...privately, ...headers } })
}

function waitSeconds(request: Request): number {
  const asked = request.headers.get('prefer')?.match(/\bwait=(\d{1,4})\b/)?.[1]
  return asked === undefined ? longestWaitSeconds : Math.min(longestWaitSeconds, Number(asked))
}

async function within(work: Promise<void>, seconds: number): Promise<boolean> {
  let timer: NodeJS.Timeout | undefined
  const late = new Promise<boolean>((resolve) => {
    timer = setTimeout(() => resolve(false), seconds * 1000)
  })
  const ended = await Promise.race([work.then(() => true), late])
  clearTimeout(timer)
  return ended
}
