import type { RouteConfigEntry } from '@react-router/dev/routes'
import { afterAll, beforeAll, describe, expect, test, vi } from 'vitest'
import routes from '../../app/routes.ts'
import { type FreshDatabase, freshDatabase } from '../database.ts'
import { signIn } from '../people.ts'
import { access, type Outcome } from './access.ts'
import { type Application, builtApplication } from './application.ts'
import { makeWorld, type Params, type Visitor, visitors, type World } from './world.ts'

let db: FreshDatabase
let application: Application
let world: World
beforeAll(async () => {
  db = await freshDatabase()
  application = await builtApplication()
  world = await makeWorld(db.database)
}, 600_000)
afterAll(() => db.close())

/** Every path of the site map, layouts resolved. */
function paths(entries: RouteConfigEntry[], parent = ''): string[] {
  return entries.flatMap((entry) => {
    const path = entry.path ? `${parent}/${entry.path}` : parent
    if (!entry.children) return [path || '/']
    return paths(entry.children, path)
  })
}

const siteMap = paths(routes as RouteConfigEntry[])

function fill(path: string, params: Record<string, string>): string {
  return path.replace('*', 'no/such/page').replaceAll(/:(\w+)/g, (_, name: string) => {
    const value = params[name]
    if (!value) throw new Error(`The test world has no ${name}.`)
    return value
  })
}

const cookies = new Map<Visitor, string>()

async function cookieOf(visitor: Visitor, isNew: boolean): Promise<string> {
  if (visitor === 'signed out') return ''
  const kept = cookies.get(visitor)
  if (kept && !isNew) return kept
  const cookie = await signIn(db.database, world.people[visitor])
  cookies.set(visitor, cookie)
  return cookie
}

async function send(
  visitor: Visitor,
  path: string,
  method: string,
  { form = '', headers = {} }: { form?: string; headers?: Record<string, string> } = {},
) {
  // These two end the session that they come with.
  const endsSession = /^\/(sign-out|account)/.test(path)
  const cookie = await cookieOf(visitor, endsSession)
  if (endsSession) cookies.delete(visitor)
  const isReading = method === 'GET'
  const response = await application(path, {
    method,
    headers: {
      accept: isReading ? 'text/html' : '*/*',
      'sec-fetch-site': 'same-origin',
      ...(isReading ? {} : { 'content-type': 'application/x-www-form-urlencoded' }),
      ...(cookie ? { cookie } : {}),
      ...headers,
    },
    body: isReading ? undefined : form,
  })
  const body = await response.text()
  return { response, body }
}

/** The outcome in the words of the table; a status that has none is named as it is. */
function outcomeOf(response: Response, body: string, isReading = false): Outcome | string {
  const { status } = response
  // React Router's own form of a redirect in the background names the target in the body.
  const location = response.headers.get('location') ?? (status === 202 ? body : '')
  if (location) return /["/]\/?sign-in(\?|"|$)/.test(location) ? 'sign in first' : 'led on'
  if (status === 200) return 'shown'
  if (status === 401) return 'sign in first'
  if (status === 403) return 'forbidden'
  if (status === 404) return 'hidden'
  // React Router answers 400 to a reading where there is nothing to read.
  if (status === 405 || (status === 400 && isReading)) return 'no method'
  if ([400, 409, 413, 415, 422].includes(status)) return 'let through'
  return `status ${status}`
}

/** A deed that was allowed is done, refused for what it lacks, or leads on. */
function deed(outcome: string, expected: Outcome): string {
  return expected === 'let through' && (outcome === 'shown' || outcome === 'led on') ? 'let through' : outcome
}

test('Every route has its line in the table of access, and the table names no other', () => {
  expect(Object.keys(access).sort()).toEqual([...new Set(siteMap)].sort())
})

describe.each(siteMap)('%s', (path) => {
  const entry = access[path]
  if (!entry) throw new Error(`${path} is missing from the table of access.`)
  const params = () => ({ ...world.own, jobId: world.jobId }) as Record<string, string>
  const inBackground = (filled: string) => (filled === '/' ? '/_.data' : `${filled}.data`)

  test.each(visitors)('as %s: reading', async (visitor) => {
    const filled = fill(path, params())
    const search = fill(entry.search ?? '', params())
    // Where a route has nothing to read, its data in the background are those of the layout above it.
    const isSilent = entry.get[visitor] === 'no method'
    for (const target of isSilent ? [filled] : [filled + search, inBackground(filled) + search]) {
      const { response, body } = await send(visitor, target, 'GET')
      expect(outcomeOf(response, body, true), `GET ${target}: ${body.slice(0, 300)}`).toBe(entry.get[visitor])
    }
  })

  test.each(visitors)('as %s: doing', async (visitor) => {
    const filled = fill(path, params())
    const expected = entry.post[visitor]
    for (const [method, target] of [
      ['POST', filled],
      ['POST', inBackground(filled)],
      ['PUT', filled],
      ['DELETE', inBackground(filled)],
    ] as const) {
      const { response, body } = await send(visitor, target, method, {
        form: fill(entry.form ?? '', params()),
      })
      const outcome = deed(outcomeOf(response, body), expected)
      // Where a route knows POST only, it may say so to anybody: nothing is done.
      if (method !== 'POST' && outcome === 'no method') continue
      expect(outcome, `${method} ${target}: ${body.slice(0, 300)}`).toBe(expected)
    }
  })
})

const childNames = ['runId', 'importId', 'instrumentId', 'fileId', 'packageId'] as const
const withChild = siteMap.flatMap((path) =>
  childNames.filter((name) => path.includes(`:${name}`)).map((name): [string, keyof Params] => [path, name]),
)

test.each(withChild)(
  '%s: the %s of another project is not found, whoever asks and whatever for',
  async (path, name) => {
    const entry = access[path]
    if (!entry) throw new Error(`${path} is missing from the table of access.`)
    const mixed = fill(path, { ...world.own, [name]: world.foreign[name] })
    const invented = fill(path, { ...world.own, [name]: '999999' })
    for (const visitor of visitors) {
      for (const target of [mixed, invented]) {
        const got = await send(visitor, target, 'GET')
        const read = outcomeOf(got.response, got.body, true)
        expect(read, `${visitor}: GET ${target}`).toBe(
          entry.get[visitor] === 'shown' ? 'hidden' : entry.get[visitor],
        )
        const sent = await send(visitor, target, 'POST')
        const done = outcomeOf(sent.response, sent.body)
        const expected = entry.post[visitor] === 'let through' ? 'hidden' : entry.post[visitor]
        expect(done, `${visitor}: POST ${target}`).toBe(expected)
      }
    }
  },
)

test('The fit of a run of another project is not found', async () => {
  for (const path of ['fit', 'fit/download']) {
    const target = `/projects/${world.own.projectId}/${path}?run=${world.foreign.runId}&date=2026-01-01`
    const { response, body } = await send('originator', target, 'GET')
    expect([response.status, body.includes('Run 1')], target).toEqual(
      path === 'fit' ? [200, false] : [404, false],
    )
  }
})

test('A project of other people is not found under any of its addresses', async () => {
  for (const path of siteMap.filter((candidate) => candidate.startsWith('/projects/:projectId'))) {
    const target = fill(path, world.foreign)
    for (const visitor of ['originator', 'project manager', 'client', 'administrator'] as const) {
      for (const method of ['GET', 'POST']) {
        const { response } = await send(visitor, target, method)
        expect(response.status, `${visitor}: ${method} ${target}`).toBe(404)
      }
    }
  }
})

test('A project id that is none is not found either', async () => {
  for (const id of ['0', '999999', '-1', '1e3', 'new.data', '1%20or%201=1', '99999999999999999999']) {
    const { response } = await send('project manager', `/projects/${id}/cover`, 'GET')
    expect(response.status, id).toBe(404)
  }
})

test('A client gets an issued package and no draft; colleagues get both', async () => {
  const { projectId, packageId } = world.own
  const pdf = (id: string) => `/projects/${projectId}/packages/${id}/pdf`
  expect((await send('client', pdf(packageId), 'GET')).response.status).toBe(200)
  expect((await send('client', pdf(world.draftPackageId), 'GET')).response.status).toBe(404)
  expect((await send('checker', pdf(world.draftPackageId), 'GET')).response.status).toBe(200)
})

test('What another site makes a browser send is done nowhere', async () => {
  // React Router reports each form that it refuses for its origin.
  const printed = vi.spyOn(console, 'error').mockImplementation(() => {})
  for (const path of siteMap) {
    const target = fill(path, { ...world.own, jobId: world.jobId })
    for (const suffix of ['', '.data']) {
      const { response } = await send('originator', target === '/' ? '/_.data' : target + suffix, 'POST', {
        headers: { 'sec-fetch-site': 'cross-site', origin: 'https://elsewhere.test' },
      })
      // React Router answers 400, our guard 403; 404 and 405 do nothing either.
      expect([400, 403, 404, 405], `POST ${target}${suffix}: ${response.status}`).toContain(response.status)
    }
  }
  const words = printed.mock.calls.map((call) => call.map(String).join(' '))
  printed.mockReset()
  expect(words.filter((line) => !/Bad Request|does not match/.test(line))).toEqual([])
})
