import type { Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { atGrid } from '../../database/seeds/site-plan.ts'
import { demoProjectPath, type Lavant, openLavant, textOf } from './lavant.ts'
import { rowsSaved, sheetOf } from './sheet.ts'

let lavant: Lavant
let page: Page
let project: string
let runNumber: string

beforeAll(async () => {
  lavant = await openLavant()
  page = await lavant.as('originator')
  project = await demoProjectPath(page)
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

async function totalAbstraction(): Promise<number> {
  const carried = page.getByRole('complementary', { name: 'Carried forward' })
  const text = await textOf(carried.locator('div', { hasText: 'Total abstraction' }).locator('dd'))
  return Number(/[\d\s,]+/.exec(text)?.[0].replaceAll(/[^\d]/g, ''))
}

test('A well is added in the sheet of wells, its radius typed in feet, and is still there after a reload', async () => {
  await page.goto(`${project}/water`)
  const wells = sheetOf(page, 'Wells')
  await wells.add('well')
  const [x, y] = atGrid([600, 300])
  await wells.fill('name', 'W21', 'Tab')
  await wells.fill('x', x.toFixed(1), 'Tab')
  await wells.fill('y', y.toFixed(1), 'Tab')
  await page.keyboard.press('Tab')
  await wells.fill('rate', '60', 'Tab')
  const status = await rowsSaved(page, () => wells.fill('radius', '0.5 ft', 'Enter'))
  expect(status).toBe(200)
  await page.getByText(/^All saved/).waitFor()
  await page.reload()
  const radius = await wells.cell('W21', 'radius')
  expect(await textOf(radius)).toBe('0.15240.5 ft')
  expect(await textOf(await wells.cell('W21', 'kind'))).toBe('abstraction')
})

test('The rate of a well is changed, and the total abstraction follows', async () => {
  const wells = sheetOf(page, 'Wells')
  const before = await totalAbstraction()
  const rate = Number(await textOf(await wells.cell('W1', 'rate')))
  expect(await rowsSaved(page, () => wells.type('W1', 'rate', String(rate + 30)))).toBe(200)
  expect(await textOf(await wells.cell('W1', 'rate'))).toBe(String(rate + 30))
  expect(await totalAbstraction()).toBe(before + 30)
})

test('The base case runs with its progress shown, through a reload of the page, and converges', async () => {
  await page.getByRole('link', { name: '4 Cases' }).click()
  await page.getByRole('button', { name: 'Run Eight wells, wall to the clay' }).click()
  const followed = page.getByRole('region', { name: /^Run \d+$/ }).first()
  await followed.getByRole('progressbar').waitFor()
  runNumber = (await followed.getAttribute('aria-label'))?.replace('Run ', '') ?? ''
  await page.reload()
  const line = page
    .getByRole('table', { name: 'Runs' })
    .getByRole('row')
    .filter({ has: page.getByRole('rowheader', { name: runNumber, exact: true }) })
  await line.getByText('converged', { exact: true }).waitFor({ timeout: 120_000 })
})

test('The heads of the run are drawn as a figure, and the pointer reads a head on it', async () => {
  await page.getByRole('link', { name: '5 Heads' }).click()
  await page.getByText(new RegExp(`converged · run ${runNumber} by Ines Marlowe`)).waitFor()
  const figure = page.getByRole('img', { name: /^Fig\. 5\.1 Heads/ })
  const canvas = figure.locator('canvas').first()
  await canvas.waitFor()
  expect(await coloursIn(canvas)).toBeGreaterThan(30)
  await canvas.hover()
  await page.getByText(/head\s+-?−?\d+\.\d{3}\s+m/).waitFor()
})

test('A cut along a line between two clicks is drawn below the plan', async () => {
  const canvas = page
    .getByRole('img', { name: /^Fig\. 5\.1/ })
    .locator('canvas')
    .first()
  const box = await canvas.boundingBox()
  if (!box) throw new Error('The figure has no place on the page.')
  await page.getByRole('button', { name: 'Cut by two clicks' }).click()
  await page.getByText('Click where the cut begins, A.').waitFor()
  for (const part of [0.3, 0.7]) {
    const spot = { x: box.width * part, y: box.height * 0.5 }
    await canvas.click({ position: spot })
  }
  const cut = page.getByRole('img', { name: /^Fig\. 5\.2 Heads along A–A′.*Lowest/ })
  await cut.waitFor()
  expect(await coloursIn(cut.locator('canvas').first())).toBeGreaterThan(5)
})

test('Drawdown against the run before pumping is largest at the wells, and stands in the table of points', async () => {
  const against = page.getByLabel('Against')
  const before = await against.locator('option', { hasText: 'Before pumping' }).first().getAttribute('value')
  await against.selectOption(before)
  await page.getByRole('button', { name: 'Drawdown' }).click()
  await page.getByRole('img', { name: /^Fig\. 5\.1 Drawdown from run \d+ \(Before pumping\)/ }).waitFor()
  const points = page.getByRole('table', { name: 'Heads at named points' })
  const drawdown = async (name: string) => {
    const row = points.getByRole('row').filter({ has: page.getByRole('button', { name, exact: true }) })
    return Number((await textOf(row.getByRole('cell').last())).replace('−', '-'))
  }
  const [underTheDig, farAway] = [await drawdown('P5'), await drawdown('P1')]
  expect(underTheDig).toBeGreaterThan(2)
  expect(farAway).toBeGreaterThan(0)
  expect(farAway).toBeLessThan(underTheDig / 2)
})

test('The run is held against the readings of a day, and the comparison is kept in the book', async () => {
  await page.getByRole('link', { name: '7 Fit' }).click()
  await page.getByRole('button', { name: 'Compare' }).waitFor()
  const choice = page.getByRole('combobox', { name: 'Run' })
  const run = await choice.locator('option', { hasText: `run ${runNumber},` }).getAttribute('value')
  await choice.selectOption(run)
  await page.getByLabel('Day').fill('2026-11-23')
  await page.getByRole('button', { name: 'Compare' }).click()
  await page.getByText(`Run ${runNumber}, Eight wells, wall to the clay · residual`).waitFor()
  await page.getByRole('img', { name: /^Modelled against measured heads of 10/ }).waitFor()
  await page.getByRole('button', { name: 'Keep this comparison in the book' }).click()
  await page.getByText(`The comparison with run ${runNumber} is kept as section 7.`).waitFor()
  const references = page.getByRole('complementary', { name: 'References' })
  await references.getByText(`run ${runNumber}, readings of 23 Nov 2026, by Ines Marlowe`).waitFor()
})

/** How many different colours a canvas shows: an empty one shows one. */
function coloursIn(canvas: ReturnType<Page['locator']>): Promise<number> {
  return canvas.evaluate((element) => {
    const { width, height } = element as HTMLCanvasElement
    const pixels = (element as HTMLCanvasElement).getContext('2d')?.getImageData(0, 0, width, height).data
    const colours = new Set<number>()
    for (let i = 0; pixels && i < pixels.length; i += 4 * 37) {
      colours.add((pixels[i] ?? 0) * 65536 + (pixels[i + 1] ?? 0) * 256 + (pixels[i + 2] ?? 0))
    }
    return colours.size
  })
}
