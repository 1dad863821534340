import { redirect } from 'react-router'
import { isSectionKey } from '~/book/sections'
import { checkSection } from '~/book/sections.server'
import { permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/check'

export function loader(): never {
  throw new Response('Sections are ticked by POST.', { status: 405 })
}

/** A checker ticks a section in its present state; the page it was ticked on reads its states again. */
export async function action({ request, context }: Route.ActionArgs) {
  const { project, user } = permit(context, 'check', 'section')
  const form = await request.formData()
  const section = String(form.get('section') ?? '')
  if (!isSectionKey(section)) throw new Response('There is no such section.', { status: 400 })
  const done = await checkSection(database(), project.id, section, user.userId)
  if (!done) throw new Response('There is nothing in this section to check yet.', { status: 409 })
  throw redirect(`/projects/${project.id}/${section}`)
}
