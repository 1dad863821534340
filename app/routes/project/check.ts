import { redirect } from 'react-router'
import { isSectionKey } from '~/book/sections'
import { checkSection } from '~/book/sections.server'
import { permit } from '~/projects/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/check'

export function loader(): never {
  throw new Response('Sections are ticked by POST.', { status: 405 })
}

/** A checker ticks a section as it was on the page; the page it was ticked on reads its states again. */
export async function action({ request, context }: Route.ActionArgs) {
  const { project, user } = permit(context, 'check', 'section')
  const form = await request.formData()
  const section = String(form.get('section') ?? '')
  if (!isSectionKey(section)) throw new Response('There is no such section.', { status: 400 })
  const seen = String(form.get('seen') ?? '')
  const answer = await checkSection(database(), project.id, section, user.userId, seen)
  if (answer === 'nothing to check') {
    throw new Response('There is nothing in this section to check yet.', { status: 409 })
  }
  if (answer === 'changed meanwhile') {
    throw new Response(
      'Somebody changed this section after you opened it: go back, look again, then tick it.',
      {
        status: 409,
      },
    )
  }
  throw redirect(`/projects/${project.id}/${section}`)
}
