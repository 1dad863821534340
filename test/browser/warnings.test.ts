import type { Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { demoProjectPath, type Lavant, openLavant } from './lavant.ts'
import { makeRevision, runBaseCase, withdrawOpenRevision } from './revision.ts'
import { rowsSaved, sheetOf } from './sheet.ts'

let lavant: Lavant
let originator: Page
let project: string

beforeAll(async () => {
  lavant = await openLavant()
  originator = await lavant.as('originator')
  project = await demoProjectPath(originator)
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

async function setToe(level: string) {
  await originator.goto(`${project}/water`)
  const walls = sheetOf(originator, 'Cut-off walls')
  expect(await rowsSaved(originator, () => walls.type('Cut-off wall', 'toe', level))).toBe(200)
}

test('A wall that ends above the clay keeps a package from being signed until somebody accepts it with a reason', async () => {
  await setToe('-11')
  const run = await runBaseCase(originator, project)
  await originator.goto(`${project}/package`)
  await withdrawOpenRevision(originator)
  await makeRevision(originator, run, 'Toe of the wall as built')
  await originator.getByText('A warning waits to be accepted before anybody signs.').waitFor()
  const sign = originator.getByRole('button', { name: 'Sign as originator' })
  expect(await sign.isDisabled()).toBe(true)

  await originator.getByRole('link', { name: `Run ${run}, section 5` }).click()
  const warnings = originator.getByRole('region', { name: 'Warnings of the run' })
  const accept = warnings.getByRole('button', { name: 'Accept what is ticked' })
  await warnings.getByRole('checkbox', { name: 'Accept this warning' }).check()
  lavant.forgive(400)
  await warnings.getByLabel('Why the result may be used all the same').fill('fine')
  await accept.click()
  await warnings.getByText('Say why in a sentence at least').waitFor()
  const reason = 'The vertical section of sheet 14 gives 6 % more inflow; the pumps have 25 % in hand.'
  await warnings.getByLabel('Why the result may be used all the same').fill(reason)
  await accept.click()
  await warnings.getByText(`: ${reason}`).waitFor()
  await warnings.getByText(/Accepted by Ines Marlowe on \d+ \w+ \d{4}/).waitFor()

  await originator.goto(`${project}/package`)
  await originator.getByRole('button', { name: 'Gather the book again' }).click()
  await originator.getByText('The book was gathered again.').waitFor()
  await originator.getByRole('link', { name: /^P\d+ PDF$/ }).waitFor({ timeout: 120_000 })
  await sign.click()
  await originator.getByText('The next move is with the checker.').waitFor()
})

test('The wall reaches the clay again', async () => {
  await setToe('-14.6')
  await originator.goto(`${project}/package`)
  await withdrawOpenRevision(originator)
})
