import type { Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { demoProjectPath, type Lavant, openLavant, textOf } from './lavant.ts'
import { checkWaitingSections, sectionsThatAre, withRevisionSharedForCheck } from './revision.ts'

let lavant: Lavant
let page: Page
let project: string

beforeAll(async () => {
  lavant = await openLavant()
  const originator = await lavant.as('originator')
  project = await demoProjectPath(originator)
  await withRevisionSharedForCheck(originator, project, 'Recharge of Basin B, for the check')
  page = await lavant.as('checker')
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

test('The checker cannot sign before the sections that wait are checked', async () => {
  await page.goto(`${project}/package`)
  expect(await sectionsThatAre(page, 'drafted', 'changed since check')).not.toEqual([])
  await page.getByRole('button', { name: 'Sign as checker' }).click()
  await page.getByText(/Check these sections first:/).waitFor()
  lavant.forgive(400)
})

test('Each section that waits is ticked, and the spine shows it as checked', async () => {
  expect(await checkWaitingSections(page)).toContain('Heads')
  expect(await sectionsThatAre(page, 'drafted', 'changed since check')).toEqual(['Package'])
})

test('The checker signs, and the revision goes on to the approver', async () => {
  await page.getByRole('navigation', { name: 'Calc book' }).getByRole('link', { name: 'Package' }).click()
  await page.getByRole('button', { name: 'Sign as checker' }).click()
  await page.getByText('Signed as checker.').waitFor()
  await page.getByText('The next move is with the approver.').waitFor()
  const checked = page.getByText('Checked', { exact: true }).locator('xpath=..')
  expect(await textOf(checked)).toMatch(/HB \d+ \w+/)
})
