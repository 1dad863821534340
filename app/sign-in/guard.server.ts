import { createContext, type MiddlewareFunction, type RouterContextProvider, redirect } from 'react-router'
import { environment } from '~/environment.server'
import { database } from '~database/connection.server'
import { findSession } from './sessions.server'

export interface SignedIn {
  userId: number
  name: string
  email: string
  isAdministrator: boolean
}

/** Filled by `requireSignIn` for every loader and action below it. */
export const signedInContext = createContext<SignedIn>()

/** SHA-256 of the session id in use; filled by `requireSignIn`. */
export const sessionContext = createContext<string>()

const signedOut =
  'You are signed out, so nothing was saved. Sign in in another tab, then send this again: what you entered is still here.'

type Plain = string | Plain[] | { [key: string]: Plain }

/** React Router's wire format for an answer in the background: one flat array whose objects refer to its indices. */
function wireFormat(value: Plain): string {
  const flat: unknown[] = []
  function place(item: Plain): number {
    const index = flat.push(null) - 1
    if (typeof item === 'string') flat[index] = item
    else if (Array.isArray(item)) flat[index] = item.map(place)
    else
      flat[index] = Object.fromEntries(
        Object.entries(item).map(([key, part]) => [`_${place(key)}`, place(part)]),
      )
    return index
  }
  place(value)
  return `${JSON.stringify(flat)}\n`
}

/** Decodes to the result of a form with one error of its own: the entered values stay where they are. */
const signedOutForm = wireFormat({ data: { status: 'error', error: { '': [signedOut] } } })

/** Whoever is signed in, for pages that are open to all; undefined when nobody is. */
export async function findSignedIn(request: Request): Promise<SignedIn | undefined> {
  const session = await findSession(database(), request)
  return (
    session && {
      userId: session.userId,
      name: session.name,
      email: session.email,
      isAdministrator: session.isAdministrator,
    }
  )
}

/**
 * Middleware: lets nobody through who is not signed in, and fills `signedInContext`.
 * Nothing that another site's page sent is acted on. Pages are sent to /sign-in and come back. A form sent in the background, and JSON, get 401 with a plain message,
 * so that nothing entered is lost.
 */
export const requireSignIn: MiddlewareFunction<Response> = async ({ request, url, context }, next) => {
  const isReading = request.method === 'GET' || request.method === 'HEAD'
  // React Router looks at the origin of forms for pages, but not of what is sent to a resource route.
  if (!isReading) refuseFromElsewhere(request)
  const session = await findSession(database(), request)
  if (!session) return refuse(request, url)
  const { idHash, ...user } = session
  context.set(signedInContext, user)
  context.set(sessionContext, idHash)
  const response = await next()
  // A page of the book must not be readable with the back button after signing out.
  if (!response.headers.has('Cache-Control')) response.headers.set('Cache-Control', 'private, no-store')
  return response
}

function refuse(request: Request, url: URL): Response {
  const inBackground = new URL(request.url).pathname.endsWith('.data')
  if (request.method === 'GET' || request.method === 'HEAD') {
    const isPage = inBackground || request.headers.get('accept')?.includes('text/html')
    if (isPage) throw redirect(`/sign-in?next=${encodeURIComponent(url.pathname + url.search)}`)
    throw Response.json({ error: 'You are signed out.' }, { status: 401 })
  }
  if (inBackground) {
    return new Response(signedOutForm, {
      status: 401,
      headers: { 'Content-Type': 'text/x-script', 'X-Remix-Response': 'yes', 'Cache-Control': 'no-store' },
    })
  }
  if (request.headers.get('accept')?.includes('text/html')) {
    throw new Response(
      'You are signed out, so nothing was saved. Sign in in another tab, go back, and send it again.',
      {
        status: 401,
      },
    )
  }
  throw Response.json({ error: signedOut }, { status: 401 })
}

/** The signed-in administrator of the firm. Throws 404 for anybody else. */
export function requireAdministrator(context: Readonly<RouterContextProvider>): SignedIn {
  const user = context.get(signedInContext)
  if (!user.isAdministrator)
    throw new Response('There is nothing here, or it is not yours to see.', { status: 404 })
  return user
}

/** What a browser says of the page that sent a request: 'unsaid' by a client that is no browser. */
function sender(request: Request): 'own page' | 'elsewhere' | 'unsaid' {
  const site = request.headers.get('sec-fetch-site')
  if (site) return site === 'same-origin' ? 'own page' : 'elsewhere'
  const origin = request.headers.get('origin')
  if (!origin) return 'unsaid'
  const own = [new URL(environment().address).origin, new URL(request.url).origin]
  return own.includes(origin) ? 'own page' : 'elsewhere'
}

/**
 * Refuses with 403 a request that does not come from a page of ours. For resource routes that take JSON or files.
 * A client that is no browser must send an Origin header with the configured address.
 */
export function requireSameOrigin(request: Request): void {
  if (sender(request) !== 'own page') throw elsewhere()
}

/** Refuses with 403 what another site's page sent; a client that is no browser passes. */
export function refuseFromElsewhere(request: Request): void {
  if (sender(request) === 'elsewhere') throw elsewhere()
}

function elsewhere(): Response {
  return Response.json({ error: 'This request does not come from a page of Lavant.' }, { status: 403 })
}
