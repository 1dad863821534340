import { href, redirect } from 'react-router'
import { refuseFromElsewhere } from '~/sign-in/guard.server'
import { endSession } from '~/sign-in/sessions.server'
import { database } from '~database/connection.server'
import type { Route } from './+types/sign-out'

/** A link never signs anybody out: only the form does. */
export function loader() {
  return redirect(href('/'))
}

export async function action({ request }: Route.ActionArgs) {
  refuseFromElsewhere(request)
  return redirect(href('/sign-in'), { headers: { 'Set-Cookie': await endSession(database(), request) } })
}
