import { href, redirect } from 'react-router'
import { projectsOf } from '~/projects/projects.server'
import { findSignedIn } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/home'

/** To the sign-in, to the projects, or straight to the only one that a client has. */
export async function loader({ request }: Route.LoaderArgs) {
  const user = await findSignedIn(request)
  if (!user) return redirect(href('/sign-in'))
  const projects = await projectsOf(database(), user.userId)
  const [only] = projects
  if (!user.isAdministrator && projects.length === 1 && only?.role === 'client') {
    return redirect(href('/projects/:projectId/progress', { projectId: String(only.id) }))
  }
  return redirect(href('/projects'))
}
