import type { RouteConfigEntry } from '@react-router/dev/routes'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
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

/** A session of its own for each request, since some requests end it. */
async function send(visitor: Visitor, path: string, method: string, headers: Record<string, string> = {}) {
  const cookie = visitor === 'signed out' ? '' : await signIn(db.database, world.people[visitor])
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
    body: isReading ? undefined : '',
  })
  const body = await response.text()
  return { response, body }
}

/** The outcome in the words of the table; a status that has none is named as it is. */
function outcomeOf(response: Response, body: string): Outcome | string {
  const { status } = response
  // React Router's own form of a redirect in the background names the target in the body.
  const location = response.headers.get('location') ?? (status === 202 ? body : '')
  if (location) return /["/]\/?sign-in(\?|"|$)/.test(location) ? 'sign in first' : 'led on'
  if (status === 200) return 'shown'
  if (status === 401) return 'sign in first'
  if (status === 403) return 'forbidden'
  if (status === 404) return 'hidden'
  if (status === 405) return 'no method'
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
    for (const target of [filled, inBackground(filled)]) {
      const { response, body } = await send(visitor, target, 'GET')
      expect(outcomeOf(response, body), `GET ${target}: ${body.slice(0, 300)}`).toBe(entry.get[visitor])
    }
  })

  test.each(visitors)('as %s: doing', async (visitor) => {
    const filled = fill(path, params())
    const expected = entry.post[visitor]
    for (const target of [filled, inBackground(filled)]) {
      for (const method of ['POST', 'PUT', 'PATCH', 'DELETE']) {
        const { response, body } = await send(visitor, target, method)
        const outcome = deed(outcomeOf(response, body), expected)
        // A route that knows POST only says so; to nobody whom it would not let through.
        if (method !== 'POST' && expected === 'let through' && outcome === 'no method') continue
        expect(outcome, `${method} ${target}: ${body.slice(0, 300)}`).toBe(expected)
      }
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
        const read = outcomeOf(got.response, got.body)
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
  for (const path of siteMap) {
    const target = fill(path, { ...world.own, jobId: world.jobId })
    for (const suffix of ['', '.data']) {
      const { response } = await send(
        'originator',
        target === '/' ? '/_.data' : target + suffix,
        'POST',
        {
          'sec-fetch-site': 'cross-site',
          origin: 'https://elsewhere.test',
        },
      )
      // React Router answers 400, our guard 403; 404 and 405 do nothing either.
      expect([400, 403, 404, 405], `POST ${target}${suffix}: ${response.status}`).toContain(response.status)
    }
  }
})
