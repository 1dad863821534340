import type { Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { demoProjectPath, type Lavant, openLavant, textOf } from './lavant.ts'

let lavant: Lavant
let page: Page
let project: string

beforeAll(async () => {
  lavant = await openLavant()
  page = await lavant.as('client', { width: 390, height: 844 })
  project = await demoProjectPath(page)
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

test('On a phone the client comes straight to where the work stands and what is next', async () => {
  await page.goto(project)
  await page.waitForURL(`**${project}/progress`)
  await page.getByText(/^Pumping holds the water below the dig/).waitFor()
  await page.getByText(/from the hydrogeologist to the checker/).waitFor()
  const overflow = await page.evaluate(() => document.documentElement.scrollWidth - window.innerWidth)
  expect(overflow).toBeLessThanOrEqual(0)
})

test('The client sees the last reading of each instrument, how old it is, and how it lies to the prediction', async () => {
  for (let number = 1; number <= 10; number++) {
    const line = page.getByRole('listitem').filter({ has: page.getByText(`P${number}`, { exact: true }) })
    const text = await textOf(line)
    expect(text).toMatch(/ days ago| weeks ago| months ago|today or yesterday/)
    expect(text).toMatch(/as predicted|above|below|lower|higher|not/)
  }
})

test('The client reads nothing of the book on the page and finds no way into it', async () => {
  expect(await page.getByRole('navigation', { name: 'Calc book' }).count()).toBe(0)
  const links = await page
    .getByRole('link')
    .evaluateAll((all) => all.map((link) => link.getAttribute('href') ?? ''))
  expect(
    links.filter((link) => /cover|basis|ground|water|cases|heads|readings|fit|checks|history/.test(link)),
  ).toEqual([])
})

test('The issued package downloads as a PDF', async () => {
  const arriving = page.waitForEvent('download')
  await page.getByRole('link', { name: /^Download P\d\d \(PDF\)/ }).click()
  expect((await arriving).suggestedFilename()).toMatch(/P\d\d.*\.pdf$/)
})

test('The book, its runs and files, and a draft PDF are not found by a client', async () => {
  const originator = await lavant.as('originator')
  const html = await (await originator.request.get(`${project}/package`)).text()
  const drafts = [...html.matchAll(/\/projects\/\d+\/packages\/\d+\/pdf/g)].map(([path]) => path)
  const issued = await page.getByRole('link', { name: /^Download/ }).getAttribute('href')
  const all = [...new Set(drafts)].filter((path) => path !== issued)
  const answers = await Promise.all(
    [
      ...[
        'cover',
        'basis',
        'ground',
        'water',
        'cases',
        'heads',
        'readings',
        'fit',
        'checks',
        'package',
        'history',
        'settings',
      ].map((section) => `${project}/${section}`),
      `${project}/runs/1/heads`,
      `${project}/files/1`,
      `${project}/water.data`,
    ].map(async (path) => [path, (await page.request.get(path)).status()]),
  )
  expect(answers.filter(([, status]) => status !== 404)).toEqual([])
  const issuedNow = await page.request.get(issued ?? '')
  expect(issuedNow.status()).toBe(200)
  const drafted = await Promise.all(all.map(async (path) => (await page.request.get(path)).status()))
  // Superseded revisions were issued once, and stay to be read; the rest was never the client's.
  expect(drafted).toContain(404)
})
