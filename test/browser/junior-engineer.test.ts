import type { Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { demoProjectPath, type Lavant, openLavant, textOf } from './lavant.ts'

let lavant: Lavant
let page: Page
let project: string
let importPath: string
let headsBefore: number

// Either order of day and month fits, one value is no number, one visit found the pipe dry.
const dips = {
  name: 'P1 dips December.csv',
  mimeType: 'text/csv',
  buffer: Buffer.from(
    [
      'Day read;Hour read;Tape at top of pipe',
      '01/12/2025;10:17;5.61',
      '02/12/2025;10:17;5.63',
      '03/12/2025;10:17;dry',
      '04/12/2025;10:17;5.67',
      '05/12/2025;10:17;5,6x',
      '',
    ].join('\r\n'),
  ),
}

beforeAll(async () => {
  lavant = await openLavant()
  page = await lavant.as('data')
  project = await demoProjectPath(page)
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

async function upload(): Promise<void> {
  await page.goto(`${project}/readings`)
  await page.getByLabel('Choose files of readings').setInputFiles(dips)
  await page.waitForURL(/\/readings\/imports\/\d+$/)
}

async function counts(): Promise<string> {
  const line = page.getByText('rows in the file').locator('xpath=..')
  await line.waitFor({ timeout: 120_000 })
  return textOf(line)
}

/** Number of heads that the hydrograph of P1 holds. */
async function headsOfP1(): Promise<number> {
  await page.goto(`${project}/readings`)
  await page
    .getByRole('table', { name: 'Last readings' })
    .getByRole('link', { name: 'P1', exact: true })
    .click()
  const heading = page.getByRole('heading', { name: /Hydrograph of P1/ })
  await heading.waitFor()
  const canvas = page.getByRole('img', { name: /P1/ }).locator('canvas').first()
  await canvas.waitFor()
  const aside = await textOf(heading.locator('xpath=..'))
  return Number((/([\d,\s]+) heads/.exec(aside)?.[1] ?? '').replaceAll(/\D/g, ''))
}

test('The hydrograph of a piezometer shows its record before the import', async () => {
  headsBefore = await headsOfP1()
  expect(headsBefore).toBeGreaterThan(20)
})

test('A file of dips is uploaded, and what its columns mean is answered', async () => {
  await upload()
  importPath = new URL(page.url()).pathname
  await page.getByLabel('Which instrument was read').selectOption('one')
  await page.getByLabel('Instrument', { exact: true }).selectOption({ label: 'P1' })
  await page.getByLabel('When it was read').selectOption('columns')
  await page.getByLabel('Column of the date, or of date and time').selectOption({ label: 'A: Day read' })
  await page.getByLabel('Column of the time').selectOption({ label: 'B: Hour read' })
  await page.getByLabel('Column of the value').selectOption({ label: 'C: Tape at top of pipe' })
  await page.getByRole('button', { name: 'Read the whole file' }).click()
  await page.getByText('Something is still to be chosen: see the marked fields.').waitFor()
  lavant.forgive(400)

  await page.getByLabel('Time zone rule').selectOption('utc')
  await page.getByLabel('What was measured').selectOption('dip')
  await page.getByLabel('Unit', { exact: true }).selectOption('m')
  await page.getByRole('button', { name: 'Read the whole file' }).click()
})

test('The file allows two orders of the date, so the engineer is asked, and the preview counts what would happen', async () => {
  await page
    .getByText('The file allows more than one order of the date. Which one is it?')
    .waitFor({ timeout: 120_000 })
  await page.getByRole('button', { name: /day first|day, month, year/i }).click()
  expect(await counts()).toMatch(
    /^5 rows in the file ?= ?4 would be added ?\+ ?0 identical to what is there ?\+ ?0 in conflict ?\+ ?1 refused$/,
  )
  const refused = page.getByRole('table', { name: 'Refused rows' })
  expect(await textOf(refused)).toContain('5,6x')
  await page.getByText('1 row with the status dry').waitFor()
})

test('The readings are committed in one step, and the receipt says what came of each row', async () => {
  await page.getByRole('button', { name: 'Commit 4 readings' }).click()
  await page.getByText('These readings are in the book').waitFor({ timeout: 120_000 })
  expect(await counts()).toMatch(/4 accepted.*1 refused/)
  const receipt = await page.request.get(`${importPath}/receipt`)
  expect(receipt.headers()['content-disposition']).toContain('attachment')
  expect(await receipt.text()).toContain('5,6x')
  expect(await headsOfP1()).toBe(headsBefore + 3)
})

test('The same file once more is recognised, read the same way, and adds nothing', async () => {
  await upload()
  await page.getByText('This very file is in the readings already').waitFor()
  await page.getByText('Read as P1 dips December.csv was').waitFor()
  await page.getByRole('button', { name: 'Read the whole file' }).click()
  expect(await counts()).toMatch(/0 would be added.*4 identical to what is there/)
  await page.getByRole('button', { name: 'Commit 0 readings' }).click()
  await page.getByText('These readings are in the book').waitFor({ timeout: 120_000 })
  expect(await headsOfP1()).toBe(headsBefore + 3)
})

test('The first import is undone whole, and the hydrograph is as it was', async () => {
  await page.goto(importPath)
  await page.getByText('Undo this import', { exact: true }).click()
  await page.getByRole('button', { name: 'Undo the whole import' }).click()
  await page.getByText('This import was undone').waitFor()
  expect(await headsOfP1()).toBe(headsBefore)
})
