import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { codeFor, type Lavant, mailTo, openLavant, textOf } from './lavant.ts'

let lavant: Lavant
let page: Awaited<ReturnType<Lavant['as']>>

const colleague = { name: 'Nadia Fell', email: 'nadia.fell@lavant.example' }
const invited = { name: 'Bram Holt', email: 'bram.holt@partner.example' }
const title = 'Mill Reach pumping station'

beforeAll(async () => {
  lavant = await openLavant()
  page = await lavant.as('administrator')
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

test('A person is added to the firm', async () => {
  await page.goto('/people')
  await page.getByLabel('Name').fill(colleague.name)
  await page.getByLabel('E-mail address').fill(colleague.email)
  await page.getByRole('button', { name: 'Add the person' }).click()
  await page.getByText(`${colleague.name} can sign in now.`).waitFor()
  const line = page.getByRole('listitem').filter({ hasText: colleague.email })
  expect(await textOf(line)).toContain('not signed in yet')
})

test('A project is made with its grid reference system, datum, time zone and units', async () => {
  await page.goto('/projects')
  await page.getByRole('link', { name: 'New project' }).click()
  await page.getByRole('button', { name: 'Create the project' }).click()
  await page.getByText('Give the project its number.').waitFor()
  await page.getByLabel('Project number').fill('26-0502')
  await page.getByLabel('Calculation reference').fill('MR-GW-001')
  await page.getByLabel('Title').fill(title)
  await page.getByLabel('Client').fill('Reach Drainage')
  await page.getByLabel('Grid reference system (EPSG code)').fill('27700')
  await page.getByLabel('Vertical datum').fill('m above Ordnance Datum Newlyn')
  await page.getByLabel('Time zone of the site').fill('Europe/London')
  await page.getByLabel('Lengths shown in').selectOption('ft')
  await page.getByRole('button', { name: 'Create the project' }).click()
  await page.getByRole('heading', { name: 'Project settings' }).waitFor()
  expect(new URL(page.url()).pathname).toMatch(/^\/projects\/\d+\/settings$/)
})

test('A colleague becomes a member, and somebody new is invited by mail', async () => {
  const invite = page.locator('form').filter({ has: page.getByRole('heading', { name: 'Invite by e-mail' }) })
  for (const [person, role] of [
    [colleague, 'checker'],
    [invited, 'originator'],
  ] as const) {
    const asked = new Date()
    await invite.getByLabel('E-mail address').fill(person.email)
    await invite.getByLabel('Name').fill(person.name)
    await invite.getByLabel('Role').selectOption(role)
    await invite.getByRole('button', { name: 'Invite' }).click()
    await page.getByRole('listitem').filter({ hasText: person.email }).waitFor()
    expect(await mailTo(person.email, asked, new RegExp(title))).toContain('/sign-in')
  }
})

test('The invited person signs in with the code of the mail and finds the project', async () => {
  const window = await lavant.stranger()
  const asked = new Date()
  await window.goto('/sign-in')
  await window.getByLabel('E-mail address').fill(invited.email)
  await window.getByRole('button', { name: 'Send me a code' }).click()
  await window.getByLabel('Code').fill(await codeFor(invited.email, asked))
  await window.getByRole('button', { name: 'Sign in' }).click()
  await window.getByRole('link', { name: title }).click()
  await window.getByText(invited.name).first().waitFor()
  await window.getByRole('heading', { name: /Cover/ }).first().waitFor()
})
