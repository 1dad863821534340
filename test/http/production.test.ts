import { afterAll, beforeAll, expect, test } from 'vitest'
import { type FreshDatabase, freshDatabase } from '../database.ts'
import { makePerson } from '../people.ts'
import { type Application, builtApplication } from './application.ts'

let db: FreshDatabase
let application: Application
const before = { ...process.env }
beforeAll(async () => {
  db = await freshDatabase()
  await makePerson(db.database, { name: 'Ada', email: 'ada@firm.test' })
  process.env.LAVANT_MODE = 'production'
  process.env.LAVANT_ADDRESS = 'https://lavant.example.test'
  delete process.env.LAVANT_MAILBOX
  application = await builtApplication()
}, 600_000)
afterAll(async () => {
  Object.assign(process.env, before)
  await db.close()
})

test('In production there is no page of received mail', async () => {
  expect((await application('/mail')).status).toBe(404)
  expect((await application('/mail.data')).status).toBe(404)
})

test('In production the sign-in page names nobody and no demo', async () => {
  const html = await (await application('/sign-in')).text()
  expect(html).not.toContain('ada@firm.test')
  expect(html).not.toContain('mail arrives')
  expect(html).not.toContain('/mail')
})

test('Over https the cookie is Secure and bound to the host', async () => {
  const response = await application('/sign-in', {
    method: 'POST',
    body: new URLSearchParams({ email: 'nobody@elsewhere.test' }),
  })
  const [cookie] = response.headers.getSetCookie()
  expect(cookie).toMatch(/^__Host-lavant-code=/)
  expect(cookie).toMatch(/; Secure/)
  expect(cookie).toMatch(/; HttpOnly/)
  expect(cookie).toMatch(/; Path=\//)
  expect(cookie).not.toMatch(/Domain=/)
})
