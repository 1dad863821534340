import { setTimeout } from 'node:timers/promises'
import { afterAll, beforeAll, beforeEach, expect, test } from 'vitest'
import { environment } from '../../app/environment.server.ts'
import { readMailbox } from '../../app/mail/mailbox.server.ts'
import { type FreshDatabase, freshDatabase } from '../database.ts'
import { makePerson, makeProject, signIn } from '../people.ts'
import { type Application, builtApplication } from './application.ts'

let db: FreshDatabase
let application: Application
let ada: { id: number; email: string }
beforeAll(async () => {
  db = await freshDatabase()
  application = await builtApplication()
}, 600_000)
afterAll(() => db.close())
beforeEach(async () => {
  await db.database('rate_limits').delete()
  // The mailbox is shared between test files: an address of its own for every test.
  const email = `ada.${crypto.randomUUID()}@firm.test`
  ada = { id: await makePerson(db.database, { name: 'Ada', email }), email }
})

function post(path: string, form: Record<string, string>, headers: Record<string, string> = {}) {
  return application(path, {
    method: 'POST',
    body: new URLSearchParams(form),
    headers: { accept: 'text/html', ...headers },
  })
}

const cookiesOf = (response: Response) =>
  response.headers
    .getSetCookie()
    .map((line) => line.split(';')[0] ?? '')
    .join('; ')

async function mailsTo(email: string, atLeast: number) {
  const { mailbox } = environment()
  if (!mailbox) throw new Error('There is no mailbox.')
  for (let wait = 0; wait < 100; wait++) {
    const mails = (await readMailbox(mailbox)).filter((mail) => mail.to.includes(email))
    if (mails.length >= atLeast) return mails
    await setTimeout(50)
  }
  return []
}

async function askForCode(email: string, next = '') {
  const asked = await post(`/sign-in${next}`, { email })
  const [mail] = await mailsTo(email, 1)
  const code = mail?.subject.slice(0, 6) ?? ''
  return { asked, code, cookie: cookiesOf(asked), mail }
}

test('Somebody signs in with the code from the mail, comes back to the page they wanted, and signs out', async () => {
  const projectId = await makeProject(db.database, {
    number: `S-${ada.id}`,
    createdBy: ada.id,
    members: [[ada.id, 'project manager']],
  })
  const wanted = await application(`/projects/${projectId}/history`, { headers: { accept: 'text/html' } })
  const signInPage = wanted.headers.get('location') ?? ''
  expect(signInPage).toBe(`/sign-in?next=${encodeURIComponent(`/projects/${projectId}/history`)}`)
  const { asked, code, cookie } = await askForCode(ada.email.toUpperCase().toLowerCase(), signInPage.slice(8))
  expect(asked.status).toBe(302)
  const codePage = asked.headers.get('location') ?? ''
  const shown = await application(codePage, { headers: { cookie } })
  expect(await shown.text()).toContain(ada.email)

  const entered = await post(codePage, { code: ` ${code.slice(0, 3)} ${code.slice(3)} ` }, { cookie })
  expect(entered.status).toBe(302)
  expect(entered.headers.get('location')).toBe(`/projects/${projectId}/history`)
  const session = cookiesOf(entered)
  const page = await application(`/projects/${projectId}/history`, { headers: { cookie: session } })
  expect(page.status).toBe(200)
  expect(page.headers.get('cache-control')).toMatch(/no-store/)

  const out = await post('/sign-out', {}, { cookie: session })
  expect(out.headers.get('location')).toBe('/sign-in')
  const after = await application(`/projects/${projectId}/history`, {
    headers: { cookie: session, accept: 'text/html' },
  })
  expect(after.status).toBe(302)
})

test('Attack: a code that was used once signs in nobody again', async () => {
  const { code, cookie } = await askForCode(ada.email)
  expect((await post('/sign-in/code', { code }, { cookie })).status).toBe(302)
  const again = await post('/sign-in/code', { code }, { cookie })
  expect(again.headers.getSetCookie().some((line) => line.startsWith('lavant='))).toBe(false)
})

test('Attack: five wrong codes end the code', async () => {
  const { code, cookie } = await askForCode(ada.email)
  for (let step = 1; step <= 5; step++) {
    const wrong = String((Number(code) + step) % 1_000_000).padStart(6, '0')
    const answer = await post('/sign-in/code', { code: wrong }, { cookie })
    expect(answer.headers.getSetCookie().some((line) => line.startsWith('lavant='))).toBe(false)
  }
  const right = await post('/sign-in/code', { code }, { cookie })
  expect(right.headers.getSetCookie().some((line) => line.startsWith('lavant='))).toBe(false)
})

test('Attack: the e-mail in the cookie of the package, changed by hand, signs in nobody', async () => {
  const { code } = await askForCode(ada.email)
  const victim = `bea.${ada.id}@firm.test`
  await makePerson(db.database, { name: 'Bea', email: victim })
  const cookie = `_totp=${encodeURIComponent(new URLSearchParams({ email: victim }).toString())}`
  const answer = await post('/sign-in/code', { code }, { cookie })
  expect(answer.headers.getSetCookie().some((line) => line.startsWith('lavant='))).toBe(false)
})

test('Attack: a forged Host header does not get into the mail', async () => {
  const response = await post(
    '/sign-in',
    { email: ada.email },
    { 'x-forwarded-host': 'evil.example', forwarded: 'host=evil.example', host: 'evil.example' },
  )
  expect(response.status).toBe(302)
  const [mail] = await mailsTo(ada.email, 1)
  expect(JSON.stringify(mail)).not.toContain('evil.example')
  expect(mail?.text).toContain(environment().address)
  expect(mail?.text).not.toMatch(/https?:\/\/\S+\?/)
})

test('Nobody learns from the answer whether an address is known', async () => {
  const known = await post('/sign-in', { email: ada.email })
  const unknown = await post('/sign-in', { email: 'nobody@elsewhere.test' })
  const shape = (response: Response) => [
    response.status,
    response.headers.get('location'),
    response.headers.getSetCookie().map((line) => line.replace(/=[^;]*/, '').replace(/Expires=[^;]*/, '')),
  ]
  expect(shape(unknown)).toEqual(shape(known))
  const pageOf = async (response: Response, email: string) =>
    (await (await application('/sign-in/code', { headers: { cookie: cookiesOf(response) } })).text())
      .replaceAll(email, 'address')
      .replaceAll(/nonce="[^"]*"|"nonce-[^"]*"/g, '')
  expect(await pageOf(unknown, 'nobody@elsewhere.test')).toBe(await pageOf(known, ada.email))
  expect(await mailsTo('nobody@elsewhere.test', 0)).toEqual([])
})

test('Somebody who has left gets no code', async () => {
  await db.database('users').where({ id: ada.id }).update({ left_at: new Date() })
  expect((await post('/sign-in', { email: ada.email })).status).toBe(302)
  await setTimeout(500)
  expect(await mailsTo(ada.email, 0)).toEqual([])
})

test('A wrong address is answered with 400 and stays in its field', async () => {
  const response = await post('/sign-in', { email: 'ada at firm' })
  expect(response.status).toBe(400)
  const html = await response.text()
  expect(html).toContain('This is not an e-mail address.')
  expect(html).toContain('value="ada at firm"')
})

test('Signing out everywhere ends the session of the other browser too', async () => {
  const [desk, phone] = [await signIn(db.database, ada.id), await signIn(db.database, ada.id)]
  expect((await post('/account', { intent: 'sign out everywhere' }, { cookie: desk })).status).toBe(302)
  const after = await application('/account', { headers: { cookie: phone, accept: 'text/html' } })
  expect(after.status).toBe(302)
})
