import { PassThrough } from 'node:stream'
import { createReadableStreamFromReadable } from '@react-router/node'
import { isbot } from 'isbot'
import { type RenderToPipeableStreamOptions, renderToPipeableStream } from 'react-dom/server'
import {
  type EntryContext,
  type HandleErrorFunction,
  isRouteErrorResponse,
  type RouterContextProvider,
  ServerRouter,
} from 'react-router'
import { connectDatabase } from '~database/connection.server'
import { NonceProvider } from './components/nonce'
import { environment } from './environment.server'
import { contentSecurityPolicy, newNonce, nonceContext } from './nonce.server'

export { markInterruptedJobs } from './jobs/jobs.server'

connectDatabase(environment().database)

const streamTimeout = 15_000

export default function handleRequest(
  request: Request,
  status: number,
  headers: Headers,
  routerContext: EntryContext,
  context: Readonly<RouterContextProvider>,
): Promise<Response> {
  // An unmatched URL never reaches the root's middleware, so its nonce is made here.
  const nonce = context.get(nonceContext) || newNonce()
  headers.set('Content-Type', 'text/html; charset=utf-8')
  headers.set('Content-Security-Policy', contentSecurityPolicy(nonce, import.meta.env.DEV))
  if (!headers.has('Cache-Control')) headers.set('Cache-Control', 'no-store')
  return new Promise((resolve, reject) => {
    let shellReady = false
    const whenReady: keyof RenderToPipeableStreamOptions = isbot(request.headers.get('user-agent') ?? '')
      ? 'onAllReady'
      : 'onShellReady'
    const { pipe, abort } = renderToPipeableStream(
      <NonceProvider value={nonce}>
        <ServerRouter context={routerContext} url={request.url} nonce={nonce} />
      </NonceProvider>,
      {
        nonce,
        [whenReady]() {
          shellReady = true
          const body = new PassThrough()
          resolve(new Response(createReadableStreamFromReadable(body), { status, headers }))
          pipe(body)
        },
        onShellError: reject,
        onError(error: unknown) {
          if (shellReady && !request.signal.aborted) console.error(error)
        },
      },
    )
    setTimeout(abort, streamTimeout).unref()
  })
}

/** Errors that nobody expected are logged with the path, never with the query string. */
export const handleError: HandleErrorFunction = (error, { request }) => {
  if (request.signal.aborted) return
  // A method that a route does not have, or a form from elsewhere: the caller's mistake, and answered.
  if (isRouteErrorResponse(error) && error.status < 500) return
  console.error(new URL(request.url).pathname, error)
}
