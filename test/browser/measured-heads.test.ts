import { join } from 'node:path'
import type { Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import published from '../checks/published.json'
import { addRows, newProject } from './forms.ts'
import { emailOf, type Lavant, openLavant, textOf } from './lavant.ts'

/** OD-01: 85 measured heads of a real aquifer; the statistics of a plane laid through them. */
const check = published.find((entry) => entry.id === 'OD-01') as unknown as {
  source: string
  expected: {
    rmse: number
    mae: number
    scaled_rmse: number
    plane: { h0: number; dh_dx: number; dh_dy: number }
  }
}
const { plane } = check.expected
const file = join(import.meta.dirname, '../checks/data/wolfcamp_heads.csv')
const day = '1981-06-30'
const box = { west: -240_000, east: 190_000, south: -150_000, north: 220_000 }

let lavant: Lavant
let page: Page
let project: string

beforeAll(async () => {
  lavant = await openLavant()
  const administrator = await lavant.as('administrator')
  project = await newProject(administrator, { number: 'OD-01', title: 'Heads of a deep brine aquifer' }, [
    { email: emailOf('originator'), role: 'originator' },
  ])
  page = await lavant.as('originator')
})
afterAll(() => lavant.close())
afterEach(() => expect(lavant.troubles()).toEqual([]))

test('The 85 measured heads are imported, each row a place of its own, as levels on one date', async () => {
  await page.goto(`${project}/readings`)
  await page.getByLabel('Choose files of readings').setInputFiles(file)
  await page.waitForURL(/\/readings\/imports\/\d+$/)
  await page.getByLabel('Which instrument was read').selectOption('row')
  await page.getByLabel('Prefix of the names').fill('OW')
  await page.getByLabel('Column of x (easting)').selectOption({ label: 'A: x_km' })
  await page.getByLabel('Column of y (northing)').selectOption({ label: 'B: y_km' })
  await page.getByLabel('Unit of the coordinates').selectOption('km')
  await page.getByLabel('Kind of the new instruments').selectOption('standpipe piezometer')
  await page.getByLabel('When it was read').selectOption('fixed')
  await page.getByLabel('Date', { exact: true }).fill(day)
  await page.getByLabel('Time zone rule').selectOption('utc')
  await page.getByLabel('Column of the value').selectOption({ label: 'C: head_m' })
  await page.getByLabel('What was measured').selectOption('level')
  await page.getByLabel('Unit', { exact: true }).selectOption('m')
  await page.getByRole('button', { name: 'Read the whole file' }).click()
  await page
    .getByRole('button', { name: 'Commit 85 readings and 85 new instruments' })
    .click({ timeout: 120_000 })
  await page.getByText('These readings are in the book').waitFor({ timeout: 120_000 })
  await page.getByText('85 instruments came with the file, from OW-01 to OW-85.').waitFor()
})

test('One material with the heads of its edge is computed in plan', async () => {
  const { west, east, south, north } = box
  const level = (x: number, y: number) => plane.h0 + plane.dh_dx * x + plane.dh_dy * y
  const line = [
    [west, south],
    [east, south],
    [east, north],
    [west, north],
    [west, south],
  ] as [number, number][]
  const metres = (value: number) => ({ value, unit: 'm' })
  const materialId = crypto.randomUUID()
  await addRows(page, project, [
    {
      kind: 'material',
      id: materialId,
      body: {
        name: 'Aquifer',
        kx: { value: 1, unit: 'm/d' },
        ky: { value: 1, unit: 'm/d' },
        source: 'One material',
      },
    },
    {
      kind: 'zone',
      id: crypto.randomUUID(),
      body: {
        name: 'Everywhere',
        materialId,
        base: metres(-700),
        top: metres(-600),
        source: 'One thickness',
      },
    },
    {
      kind: 'boundary',
      id: crypto.randomUUID(),
      body: {
        name: 'Edge',
        kind: 'fixed head',
        line,
        levels: line.map(([x, y]) => metres(level(x, y))),
        source: check.source,
      },
    },
    {
      kind: 'case',
      id: crypto.randomUUID(),
      body: {
        name: 'Heads of the edge',
        isBase: true,
        flow: 'confined',
        extent: { xMin: west, xMax: east, yMin: south, yMax: north },
        cellSize: metres(5000),
      },
    },
  ])
  await page.goto(`${project}/cases`)
  await page.getByRole('button', { name: 'Run Heads of the edge' }).click()
  await page
    .getByRole('table', { name: 'Runs' })
    .getByText('converged', { exact: true })
    .waitFor({ timeout: 120_000 })
})

test(`The fit of the 85 heads has the published residuals (${check.source})`, async () => {
  await page.getByRole('link', { name: '7 Fit' }).click()
  await page.getByLabel('Day').fill(day)
  await page.getByRole('button', { name: 'Compare' }).click()
  const sheet = page.getByRole('table', { name: 'Measured and modelled heads with residuals' })
  await sheet.getByRole('rowheader', { name: 'OW-85' }).waitFor()
  const residuals = await sheet.getByRole('row').evaluateAll((rows) =>
    rows.flatMap((row) => {
      const text = row.querySelectorAll('td')[2]?.textContent ?? ''
      const number = Number(text.replace('−', '-').replaceAll(/[\s,]/g, ''))
      return text === '' || Number.isNaN(number) ? [] : [number]
    }),
  )
  expect(residuals).toHaveLength(85)
  const rms = Math.sqrt(residuals.reduce((sum, residual) => sum + residual ** 2, 0) / 85)
  expect(rms).toBeCloseTo(check.expected.rmse, 2)
  const carried = await textOf(page.getByRole('complementary', { name: 'Carried forward' }))
  expect(carried).toMatch(/Comparisons n ?85/)
  expect(carried).toContain(`Scaled RMSE${(100 * check.expected.scaled_rmse).toFixed(1)}%`)
  expect((100 * check.expected.scaled_rmse).toFixed(1)).toBe('7.9')
})
