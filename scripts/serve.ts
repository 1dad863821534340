import { createServer } from 'node:http'
import { dirname, join } from 'node:path'
import { fileURLToPath, pathToFileURL } from 'node:url'
import { createRequestHandler } from '@react-router/express'
import express, { type NextFunction, type Request, type Response } from 'express'
import { RouterContextProvider, type ServerBuild } from 'react-router'
import { clientAddress } from '../app/client-address.ts'
import { type Environment, environment } from '../app/environment.server.ts'
import { limitBody } from './services/body-limit.ts'
import { closed, listening } from './services/listening.ts'
import { reportAndFail } from './services/report-and-fail.ts'
import { runUnderParent } from './services/under-parent.ts'

const root = dirname(dirname(fileURLToPath(import.meta.url)))
const loopbackNames = new Set(['127.0.0.1', 'localhost', '::1', '[::1]'])

/** The build, with what entry.server adds for us: jobs that were under way when the last server stopped. */
type Build = ServerBuild & { entry: { module: { markInterruptedJobs: () => Promise<void> } } }

/** Headers of every answer, assets included; a page adds its Content-Security-Policy itself. */
function securityHeaders(address: string): Record<string, string> {
  return {
    'X-Content-Type-Options': 'nosniff',
    'X-Frame-Options': 'DENY',
    'Referrer-Policy': 'same-origin',
    'Cross-Origin-Opener-Policy': 'same-origin',
    'Cross-Origin-Resource-Policy': 'same-origin',
    'Permissions-Policy': 'camera=(), microphone=(), geolocation=(), payment=(), usb=()',
    ...(address.startsWith('https:') ? { 'Strict-Transport-Security': 'max-age=31536000' } : {}),
  }
}

/** The application behind Express: headers, static files, the address of the client, and errors kept short. */
function makeServer(build: ServerBuild, settings: Environment) {
  const app = express()
  app.disable('x-powered-by')
  app.set('trust proxy', settings.trustedProxies)
  const headers = securityHeaders(settings.address)
  app.use((request, response, next) => {
    response.set(headers)
    if (settings.mode === 'production') logWhenAnswered(request, response)
    // A page elsewhere that renames itself to this machine must not read the demo's mail. Only Host counts: such a page
    // may send a forwarded host of its choice.
    if (settings.mode === 'demo' && !loopbackNames.has(hostOf(request))) {
      response.status(421).type('text').send('The demo answers to the name of this machine only.')
      return
    }
    next()
  })
  // The names of assets carry a hash of their content.
  app.use(
    '/assets',
    express.static(join(root, 'build/client/assets'), {
      immutable: true,
      maxAge: '1y',
      fallthrough: false,
      index: false,
    }),
  )
  app.use(express.static(join(root, 'build/client'), { maxAge: '1h', index: false, redirect: false }))
  app.use(limitBody)
  app.use(
    createRequestHandler({
      build,
      mode: 'production',
      getLoadContext(request) {
        const context = new RouterContextProvider()
        context.set(clientAddress, request.ip ?? 'unknown')
        return context
      },
    }),
  )
  app.use(answerError)
  return createServer(app)
}

function hostOf(request: Request): string {
  return request.headers.host?.replace(/:\d*$/, '').toLowerCase() ?? ''
}

/** One line a request. Without its query string, which may hold what a person searched for or typed. */
function logWhenAnswered(request: Request, response: Response): void {
  const path = request.path
  const begun = performance.now()
  response.on('finish', () => {
    const milliseconds = Math.round(performance.now() - begun)
    console.log(
      `${new Date().toISOString()} ${request.method} ${path} ${response.statusCode} ${milliseconds} ms`,
    )
  })
}

function answerError(error: unknown, request: Request, response: Response, next: NextFunction): void {
  const status =
    error instanceof Error && 'status' in error && typeof error.status === 'number' ? error.status : 500
  if (status >= 500) console.error(`${request.method} ${request.path}:`, error)
  if (response.headersSent) {
    next(error)
    return
  }
  response
    .status(status)
    .type('text')
    .send(status === 404 ? 'Not found' : status < 500 ? 'Bad request' : 'Something went wrong')
}

async function serve(): Promise<void> {
  const settings = environment()
  const build: Build = await import(pathToFileURL(join(root, 'build/server/index.js')).href)
  await build.entry.module.markInterruptedJobs()
  const server = makeServer(build, settings)
  // Longer than a proxy in front keeps an idle connection, so that it is never the one to find it closed.
  server.keepAliveTimeout = 65_000
  await listening(server, settings.port, settings.host)
  runUnderParent(() => closed(server))
}

await serve().catch((failure: unknown) => {
  reportAndFail(failure)
  process.exit(1)
})
