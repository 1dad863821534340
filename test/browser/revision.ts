import type { Page } from 'playwright-core'
import { textOf } from './lavant.ts'

/** The base case of the demo. */
export const baseCase = 'Eight wells, wall to the clay'

/** Computes the base case as the book stands, and waits until it has converged. Returns the number of the run. */
export async function runBaseCase(originator: Page, project: string): Promise<string> {
  await originator.goto(`${project}/cases`)
  await originator.getByRole('button', { name: `Run ${baseCase}` }).click()
  const followed = originator.getByRole('region', { name: /^Run \d+$/ }).first()
  const number = ((await followed.getAttribute('aria-label')) ?? '').replace('Run ', '')
  const line = originator
    .getByRole('table', { name: 'Runs' })
    .getByRole('row')
    .filter({ has: originator.getByRole('rowheader', { name: number, exact: true }) })
  await line.getByText('converged', { exact: true }).waitFor({ timeout: 120_000 })
  return number
}

/** Withdraws the revision that is open, if one is: at most one can be. The page is the Package's. */
export async function withdrawOpenRevision(page: Page): Promise<void> {
  await page.getByRole('heading', { name: 'Revisions', exact: false }).waitFor()
  const withdraw = page.getByText('Withdraw', { exact: true })
  if ((await withdraw.count()) === 0) return
  await withdraw.click()
  await page.getByRole('button', { name: /^Withdraw P\d+/ }).click()
  await page.getByText('No revision is open.').waitFor()
}

/** Makes a new revision of a run by the form of the page, and waits until its PDF is drawn. */
export async function makeRevision(page: Page, runNumber: string, reason: string): Promise<string> {
  const run = page.getByRole('combobox', { name: 'Run of record' })
  const option = run.locator('option', { hasText: `run ${runNumber},` })
  await run.selectOption(await option.getAttribute('value'))
  await page.getByLabel('Readings of').fill('2026-11-27')
  await page.getByLabel('Issued for').fill('Approval of the dewatering scheme')
  await page.getByLabel('What is new in this revision').fill(reason)
  await page.getByRole('button', { name: 'Make the revision' }).click()
  await page.getByText('The revision is made and is being drawn.').waitFor()
  return drawn(page)
}

/** Waits until the PDF of the open revision is drawn. Returns the number of the revision. */
export async function drawn(page: Page): Promise<string> {
  const link = page.getByRole('link', { name: /^P\d+ PDF$/ })
  await link.waitFor({ timeout: 120_000 })
  return (await textOf(link)).replace(' PDF', '')
}

/** Brings the book to a revision of its present state that its originator has signed, whatever was open before. */
export async function withRevisionSharedForCheck(
  originator: Page,
  project: string,
  reason: string,
): Promise<string> {
  const run = await runBaseCase(originator, project)
  await originator.goto(`${project}/package`)
  await withdrawOpenRevision(originator)
  const revision = await makeRevision(originator, run, reason)
  await originator.getByRole('button', { name: 'Sign as originator' }).click()
  await originator.getByText('The next move is with the checker.').waitFor()
  await drawn(originator)
  return revision
}

/** Sections of the spine in one of these states, by title. */
export async function sectionsThatAre(page: Page, ...states: string[]): Promise<string[]> {
  const lines = await page
    .getByRole('navigation', { name: 'Calc book' })
    .getByRole('listitem')
    .allInnerTexts()
  return lines.flatMap((line) => {
    const [, title = '', state = ''] = line.split('\n').map((part) => part.trim())
    return states.includes(state) ? [title] : []
  })
}

/** Ticks every section that waits for its check, and sees the spine follow. Returns their titles. */
export async function checkWaitingSections(checker: Page): Promise<string[]> {
  const waiting = (await sectionsThatAre(checker, 'drafted', 'changed since check')).filter(
    (title) => title !== 'Package',
  )
  const spine = checker.getByRole('navigation', { name: 'Calc book' })
  for (const title of waiting) {
    await spine.getByRole('link', { name: title }).click()
    await checker.getByRole('button', { name: 'Mark as checked' }).click()
    await checker.getByText(/^Checked by Hanne Brevik, /).waitFor()
    const checked = await sectionsThatAre(checker, 'checked')
    if (!checked.includes(title)) throw new Error(`${title} was ticked, and the spine does not show it.`)
  }
  return waiting
}
