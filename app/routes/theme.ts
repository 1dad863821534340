import { data, href, redirect } from 'react-router'
import { refuseFromElsewhere } from '~/sign-in/guard.server'
import { themeCookie, themes } from '~/theme.server'
import type { Route } from './+types/theme'

export function loader() {
  return redirect(href('/'))
}

/** Keeps the choice of colours. Without scripts the browser goes back to the page it came from. */
export async function action({ request }: Route.ActionArgs) {
  refuseFromElsewhere(request)
  const chosen = (await request.formData()).get('theme')
  const theme = themes.find((name) => name === chosen)
  if (!theme) return data({ error: 'The colours are light, dark or as the system.' }, 400)
  const headers = { 'Set-Cookie': await themeCookie.serialize(theme) }
  const inBackground = new URL(request.url).pathname.endsWith('.data')
  if (inBackground) return data({ theme }, { headers })
  return redirect(pathOf(request.headers.get('referer')), { headers })
}

function pathOf(referer: string | null): string {
  const url = referer ? URL.parse(referer) : null
  return url && !url.pathname.startsWith('//') ? url.pathname + url.search : '/'
}
