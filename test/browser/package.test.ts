import { execFileSync } from 'node:child_process'
import { createHash } from 'node:crypto'
import { readFileSync } from 'node:fs'
import type { Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { demoProjectPath, type Lavant, openLavant } from './lavant.ts'
import { checkWaitingSections, drawn, makeRevision, runBaseCase, withdrawOpenRevision } from './revision.ts'

let lavant: Lavant
let originator: Page
let manager: Page
let checker: Page
let approver: Page
let project: string
let run: string
let revision: string

beforeAll(async () => {
  lavant = await openLavant()
  originator = await lavant.as('originator')
  manager = await lavant.as('project manager')
  checker = await lavant.as('checker')
  approver = await lavant.as('approver')
  project = await demoProjectPath(originator)
  run = await runBaseCase(originator, project)
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

/** Downloads the open or issued revision by the link of the page. Returns path, SHA-256 and text of the PDF. */
async function downloaded(page: Page, link: RegExp) {
  const arriving = page.waitForEvent('download')
  await page.getByRole('link', { name: link }).first().click()
  const download = await arriving
  const path = await download.path()
  const bytes = readFileSync(path)
  return {
    name: download.suggestedFilename(),
    start: bytes.subarray(0, 5).toString('latin1'),
    sha256: createHash('sha256').update(bytes).digest('hex'),
    text: execFileSync('pdftotext', ['-layout', path, '-'], { encoding: 'utf8' }),
  }
}

test('The project manager makes a revision of the newest run; its PDF is a draft and says so', async () => {
  await manager.goto(`${project}/package`)
  await withdrawOpenRevision(manager)
  revision = await makeRevision(manager, run, 'Readings to the end of November')
  expect(revision).toMatch(/^P\d\d$/)
  const pdf = await downloaded(manager, new RegExp(`^${revision} PDF$`))
  expect(pdf.start).toBe('%PDF-')
  expect(pdf.text).toContain('TQ-GW-014')
  expect(pdf.text).toMatch(/DRAFT/)
})

test('The originator signs, and the revision is shared for check', async () => {
  await originator.goto(`${project}/package`)
  await originator.getByRole('button', { name: 'Sign as originator' }).click()
  await originator.getByText('The next move is with the checker.').waitFor()
  await drawn(originator)
  expect(await originator.getByRole('button', { name: /^Sign as/ }).count()).toBe(0)
})

test('The checker signs once every section is checked', async () => {
  await checker.goto(`${project}/package`)
  await checkWaitingSections(checker)
  await checker.getByRole('navigation', { name: 'Calc book' }).getByRole('link', { name: 'Package' }).click()
  await checker.getByRole('button', { name: 'Sign as checker' }).click()
  await checker.getByText('The next move is with the approver.').waitFor()
  await drawn(checker)
})

test('The approver signs, and the next move is with the project manager', async () => {
  await approver.goto(`${project}/package`)
  await approver.getByRole('button', { name: 'Sign as approver' }).click()
  await approver.getByText('The next move is with the project manager, who issues it.').waitFor()
  await drawn(approver)
})

test('The project manager issues it: the PDF is signed, is no draft, and is the file whose SHA-256 is shown', async () => {
  await manager.goto(`${project}/package`)
  await manager.getByRole('button', { name: `Issue ${revision}` }).click()
  const line = manager
    .getByRole('table', { name: 'Revisions of the package' })
    .getByRole('row')
    .filter({ has: manager.getByRole('rowheader', { name: revision, exact: true }) })
  await line.getByText('issued', { exact: true }).waitFor({ timeout: 120_000 })
  const shown = await line.locator('code').getAttribute('title')
  const link = await line.getByRole('link', { name: 'PDF' }).getAttribute('href')
  const answer = await manager.request.get(link ?? '')
  const headers = answer.headers()
  expect(headers['content-type']).toBe('application/pdf')
  expect(headers['x-content-type-options']).toContain('nosniff')
  expect(headers['content-disposition']).toContain('attachment')
  expect(headers['content-security-policy']).toContain('sandbox')

  await manager.goto(`${project}/progress`)
  const pdf = await downloaded(manager, new RegExp(`^Download ${revision}`))
  expect(pdf.name).toMatch(/\.pdf$/)
  expect(pdf.start).toBe('%PDF-')
  expect(shown).toBe(`SHA-256 ${pdf.sha256}`)
  await manager.getByText(`SHA-256 of the PDF: ${pdf.sha256}`).waitFor()
  for (const words of [
    'Tarrow Quay deep shaft',
    'TQ-GW-014',
    revision,
    'Ines Marlowe',
    'Hanne Brevik',
    'Daniel Ashgrove',
    'Readings to the end of November',
    'Pumping test PT-2, March 2026',
  ]) {
    expect(pdf.text).toContain(words)
  }
  expect(pdf.text).not.toMatch(/DRAFT|not for use/i)
})
