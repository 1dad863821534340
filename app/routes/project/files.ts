import { storePlanImage } from '~/files/plan-image.server'
import { permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/files'

/**
 * Takes a plan image as the raw body of a POST; its name comes as ?name=. Answers 201 with the file's id and its size
 * in pixels; 413, 415 or 422 with a message.
 */
export async function action({ request, context }: Route.ActionArgs) {
  const { project, user } = permit(context, 'edit', 'ground')
  if (request.method !== 'POST') return Response.json({ message: 'Send the file by POST.' }, { status: 405 })
  const answer = await storePlanImage(database(), {
    projectId: project.id,
    userId: user.userId,
    name: new URL(request.url).searchParams.get('name') ?? '',
    body: request.body,
  })
  if (!answer.ok) return Response.json({ message: answer.message }, { status: answer.status })
  const { ok: _, ...file } = answer
  return Response.json(file, { status: 201 })
}
