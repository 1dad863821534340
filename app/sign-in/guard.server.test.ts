import { UNSAFE_decodeViaTurboStream as decode, RouterContextProvider } from 'react-router'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson, signIn } from '../../test/people'
import { requireSameOrigin, requireSignIn, type SignedIn, signedInContext } from './guard.server'

let db: FreshDatabase
let cookie: string
beforeAll(async () => {
  db = await freshDatabase()
  cookie = await signIn(db.database, await makePerson(db.database, { name: 'Ada' }))
})
afterAll(() => db.close())

/** Runs the middleware; `reached` tells whether anything behind it ran. */
async function pass(path: string, init: RequestInit = {}) {
  const request = new Request(`http://lavant.test${path}`, init)
  const url = new URL(request.url.replace(/\.data(?=\?|$)/, ''))
  const context = new RouterContextProvider()
  let reached: SignedIn | undefined
  const run = async () =>
    (await requireSignIn({ request, url, context, params: {}, pattern: '' }, async () => {
      reached = context.get(signedInContext)
      return new Response('work')
    })) as Response
  const response = await run().catch((thrown: unknown) => {
    if (thrown instanceof Response) return thrown
    throw thrown
  })
  return { response, reached }
}

test('Whoever is signed in passes, and their pages are not kept by the browser', async () => {
  const { response, reached } = await pass('/projects', { headers: { cookie } })
  expect(reached).toMatchObject({ name: 'Ada', isAdministrator: false })
  expect(response.headers.get('Cache-Control')).toBe('private, no-store')
})

test.each([
  ['a page', '/projects/3/heads?run=7', { accept: 'text/html,*/*' }],
  ['a navigation in the background', '/projects/3/heads.data?run=7', { accept: '*/*' }],
])('Signed out, %s leads to sign-in and back', async (_, path, headers) => {
  const { response, reached } = await pass(path, { headers })
  expect(reached).toBeUndefined()
  expect(response.status).toBe(302)
  expect(response.headers.get('Location')).toBe('/sign-in?next=%2Fprojects%2F3%2Fheads%3Frun%3D7')
})

test('Signed out, JSON gets 401 with a plain message, for reading and for writing', async () => {
  const read = await pass('/projects/3/runs/7', { headers: { accept: 'application/json' } })
  expect([read.response.status, await read.response.json()]).toEqual([401, { error: 'You are signed out.' }])
  const write = await pass('/projects/3/rows', { method: 'POST', body: '{}', headers: { accept: '*/*' } })
  expect(write.response.status).toBe(401)
  expect(await write.response.json()).toEqual({ error: expect.stringContaining('Sign in in another tab') })
  expect(write.reached ?? read.reached).toBeUndefined()
})

test('Signed out, a form sent in the background is answered as a form with an error: its values stay', async () => {
  const { response, reached } = await pass('/projects/new.data', { method: 'POST', body: new FormData() })
  expect(reached).toBeUndefined()
  expect(response.status).toBe(401)
  expect(response.headers.get('X-Remix-Response')).toBe('yes')
  if (!response.body) throw new Error('no body')
  const decoded = await decode(response.body, globalThis as unknown as Window)
  expect(decoded.value).toEqual({
    data: { status: 'error', error: { '': [expect.stringContaining('what you entered is still here')] } },
  })
})

test('Signed out, a form of a browser without scripts gets 401 in words', async () => {
  const { response } = await pass('/projects/new', {
    method: 'POST',
    body: '',
    headers: { accept: 'text/html' },
  })
  expect(response.status).toBe(401)
  expect(await response.text()).toContain('nothing was saved')
})

test('What another site sends with this browser is refused before anything is done', async () => {
  const foreign: [string, string][] = [
    ['sec-fetch-site', 'cross-site'],
    ['origin', 'http://elsewhere.test'],
  ]
  for (const [name, value] of foreign) {
    const { response, reached } = await pass('/projects/3/runs', {
      method: 'POST',
      body: 'caseId=1',
      headers: { cookie, [name]: value },
    })
    expect([response.status, reached]).toEqual([403, undefined])
  }
})

test.each([
  ['of its own page', { 'sec-fetch-site': 'same-origin' }, true],
  ['with its own origin', { origin: 'http://lavant.test' }, true],
  ['of another site', { 'sec-fetch-site': 'cross-site', origin: 'http://lavant.test' }, false],
  ['of a neighbouring host', { 'sec-fetch-site': 'same-site' }, false],
  ['with another origin', { origin: 'http://elsewhere.test' }, false],
  ['with a hidden origin', { origin: 'null' }, false],
  ['that says nothing', {}, false],
] as [string, Record<string, string>, boolean][])('A JSON request %s', (_, headers, isAccepted) => {
  const request = new Request('http://lavant.test/projects/3/rows', { method: 'POST', headers })
  if (isAccepted) expect(() => requireSameOrigin(request)).not.toThrow()
  else expect(() => requireSameOrigin(request)).toThrow(expect.objectContaining({ status: 403 }))
})
