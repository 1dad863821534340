import type { Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { codeFor, demoProjectPath, emailOf, type Lavant, openLavant, textOf } from './lavant.ts'
import { baseCase } from './revision.ts'
import { rowsSaved, sheetOf } from './sheet.ts'

let lavant: Lavant
let page: Page
let project: string

beforeAll(async () => {
  lavant = await openLavant()
  page = await lavant.as('originator')
  project = await demoProjectPath(page)
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

test('A unit that is no length, typed as a radius, is marked in place with the reason, and nothing is saved', async () => {
  await page.goto(`${project}/water`)
  const wells = sheetOf(page, 'Wells')
  const before = await textOf(await wells.cell('W3', 'radius'))
  await wells.type('W3', 'radius', '5 kg')
  const remarks = page.getByRole('list', { name: 'Wells: remarks' })
  await remarks.getByText('W3, Radius:').waitFor()
  await page.getByText('1 cell needs attention before its row is saved').waitFor()
  const cell = await wells.cell('W3', 'radius')
  expect(await textOf(cell)).toBe('5 kg')
  expect(await cell.getAttribute('class')).toContain('sheet-wrong')
  await wells.section.getByRole('button', { name: 'Undo' }).click()
  await page.getByText('1 cell needs attention').waitFor({ state: 'detached' })
  expect(await textOf(await wells.cell('W3', 'radius'))).toBe(before)
})

test('Two tabs edit the same well: the second sees both rates and loses neither', async () => {
  const other = await page.context().newPage()
  await other.goto(`${project}/water`)
  const [first, second] = [sheetOf(page, 'Wells'), sheetOf(other, 'Wells')]
  await second.cell('W2', 'rate')
  expect(await rowsSaved(page, () => first.type('W2', 'rate', '431'))).toBe(200)
  expect(await rowsSaved(other, () => second.type('W2', 'rate', '442'))).toBe(409)
  lavant.forgive(409)
  const panel = other.getByRole('table').filter({ has: other.getByRole('columnheader', { name: 'Theirs' }) })
  const line = panel.getByRole('row').filter({ has: other.getByRole('rowheader', { name: 'Rate' }) })
  expect(await textOf(line)).toMatch(/442.*431/)
  const saved = await rowsSaved(other, () => other.getByRole('button', { name: 'Keep all of mine' }).click())
  expect(saved).toBe(200)
  await page.reload()
  expect(await textOf(await first.cell('W2', 'rate'))).toBe('442')
  await other.close()
})

test('A row typed after the session has ended is kept, and saved after signing in again in another tab', async () => {
  const wells = sheetOf(page, 'Wells')
  await wells.cell('W5', 'rate')
  await page.context().clearCookies()
  expect(await rowsSaved(page, () => wells.type('W5', 'rate', '291'))).toBe(401)
  await page.getByText(/Your changes are kept here\./).waitFor()
  lavant.forgive(401)

  const other = await page.context().newPage()
  const asked = new Date()
  await other.goto('/sign-in')
  await other.getByLabel('E-mail address').fill(emailOf('originator'))
  await other.getByRole('button', { name: 'Send me a code' }).click()
  await other.getByLabel('Code').fill(await codeFor(emailOf('originator'), asked))
  await other.getByRole('button', { name: 'Sign in' }).click()
  await other.getByRole('heading', { name: 'Projects', exact: true }).waitFor()
  await other.close()

  expect(await rowsSaved(page, () => page.getByRole('button', { name: 'Try again' }).click())).toBe(200)
  await page.getByText(/^All saved/).waitFor()
  await page.reload()
  expect(await textOf(await wells.cell('W5', 'rate'))).toBe('291')
})

test('A double click on Run starts one run', async () => {
  await page.goto(`${project}/cases`)
  const runs = page.getByRole('table', { name: 'Runs' }).getByRole('row')
  const before = await runs.count()
  await page.getByRole('button', { name: `Run ${baseCase}` }).dblclick()
  await page
    .getByRole('region', { name: /^Run \d+$/ })
    .first()
    .waitFor()
  await page.getByText('running').first().waitFor({ state: 'detached', timeout: 120_000 })
  await page.reload()
  expect(await runs.count()).toBe(before + 1)
})

test('An empty file of readings is refused with a word about it', async () => {
  await page.goto(`${project}/readings`)
  await page.getByLabel('Choose files of readings').setInputFiles({
    name: 'nothing.csv',
    mimeType: 'text/csv',
    buffer: Buffer.alloc(0),
  })
  await page.getByText('nothing.csv was not taken.').waitFor()
  await page.getByText('The file is empty.').waitFor()
  expect(new URL(page.url()).pathname).toBe(`${project}/readings`)
})

test('The back button after signing out shows nothing of the book', async () => {
  const approver = await lavant.as('approver')
  await approver.goto(`${project}/water`)
  await approver.getByText('Tarrow Quay deep shaft').first().waitFor()
  await approver.getByRole('button', { name: 'Sign out' }).first().click()
  await approver.getByRole('heading', { name: 'Sign in' }).waitFor()
  await approver.goBack()
  await approver.getByRole('heading', { name: 'Sign in' }).waitFor()
  const text = await approver.content()
  expect(text).not.toContain('Tarrow Quay')
  expect(text).not.toContain('Cut-off wall')
})
