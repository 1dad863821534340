import { href, redirect } from 'react-router'
import { membershipContext } from '~/projects/guard.server'
import { can } from '~/projects/permissions'
import type { Route } from './+types/home'

/** A client reads how things stand; everybody else opens the book at its cover. */
export async function loader({ context }: Route.LoaderArgs) {
  const { member, project } = context.get(membershipContext)
  const projectId = String(project.id)
  return redirect(
    can(member, 'view', 'book')
      ? href('/projects/:projectId/cover', { projectId })
      : href('/projects/:projectId/progress', { projectId }),
  )
}
