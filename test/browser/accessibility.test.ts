import type { RouteConfigEntry } from '@react-router/dev/routes'
import type { Page } from 'playwright-core'
import { afterAll, beforeAll, expect, test } from 'vitest'
import routes from '../../app/routes.ts'
import {
  accessibilityFaults,
  address,
  type DemoRole,
  demoProjectPath,
  emailOf,
  type Lavant,
  openLavant,
} from './lavant.ts'

interface Visit {
  /** The route as routes.ts has it. */
  route: string
  as: DemoRole | 'nobody'
  path: (project: string) => string | Promise<string>
  /** Answers to the page that are no page: 404. */
  refused?: true
}

/** A suitable person for every page. */
const visits: Visit[] = [
  { route: '/sign-in', as: 'nobody', path: () => '/sign-in' },
  { route: '/sign-in/code', as: 'nobody', path: askedForCode },
  { route: '/mail', as: 'nobody', path: () => '/mail' },
  { route: '/*', as: 'nobody', path: () => '/nowhere', refused: true },
  { route: '/', as: 'project manager', path: () => '/' },
  { route: '/account', as: 'project manager', path: () => '/account' },
  { route: '/projects', as: 'administrator', path: () => '/projects' },
  { route: '/projects/new', as: 'administrator', path: () => '/projects/new' },
  { route: '/people', as: 'administrator', path: () => '/people' },
  ...['cover', 'basis', 'ground', 'water', 'cases', 'heads', 'fit', 'checks', 'package', 'history'].map(
    (section): Visit => ({
      route: `/projects/:projectId/${section}`,
      as: 'originator',
      path: (project) => `${project}/${section}`,
    }),
  ),
  { route: '/projects/:projectId/settings', as: 'project manager', path: (project) => `${project}/settings` },
  { route: '/projects/:projectId/readings', as: 'data', path: (project) => `${project}/readings` },
  {
    route: '/projects/:projectId/readings/instruments/:instrumentId',
    as: 'data',
    path: (project) => linkedFrom(`${project}/readings`, /\/readings\/instruments\/[\w-]+/),
  },
  {
    route: '/projects/:projectId/readings/imports/:importId',
    as: 'data',
    path: (project) => linkedFrom(`${project}/readings`, /\/projects\/\d+\/readings\/imports\/\d+/),
  },
  { route: '/projects/:projectId/progress', as: 'client', path: (project) => `${project}/progress` },
]

let lavant: Lavant
let project: string
const windows = new Map<Visit['as'], Page>()

beforeAll(async () => {
  lavant = await openLavant()
  project = await demoProjectPath(await windowOf('project manager'))
})
afterAll(() => lavant.close())

async function windowOf(person: Visit['as']): Promise<Page> {
  const size = { width: 1440, height: 900 }
  const page =
    windows.get(person) ?? (await (person === 'nobody' ? lavant.stranger(size) : lavant.as(person, size)))
  windows.set(person, page)
  return page
}

/** A browser that has asked for a code may see the page that takes it. */
async function askedForCode(): Promise<string> {
  const page = await windowOf('nobody')
  await page.request.post('/sign-in', { form: { email: emailOf('client') }, headers: { Origin: address } })
  return '/sign-in/code'
}

async function linkedFrom(path: string, pattern: RegExp): Promise<string> {
  const html = await (await (await windowOf('data')).request.get(path)).text()
  const found = pattern.exec(html)?.[0]
  if (!found) throw new Error(`${path} leads to no ${pattern}.`)
  return found.startsWith('/projects') ? found : `${path.replace(/\/readings$/, '')}${found}`
}

/** Pages of routes.ts: its modules with something to see, but the frames around pages. */
function pagesOf(entries: readonly RouteConfigEntry[], parent = ''): string[] {
  return entries.flatMap((entry) => {
    const path = entry.path === undefined ? parent : `${parent}/${entry.path}`
    if (entry.children) return pagesOf(entry.children, path)
    return entry.file.endsWith('.tsx') ? [path || '/'] : []
  })
}

test('Every page of routes.ts is visited here', async () => {
  expect(visits.map(({ route }) => route).sort()).toEqual(pagesOf(await routes).sort())
})

/** Until nothing moves: the grid and charts arrive after the page. */
async function settled(page: Page): Promise<void> {
  await page.waitForLoadState('networkidle')
  await page.evaluate(() => document.fonts.ready)
  const sheets = await page.locator('.sheet').count()
  if (sheets > 0)
    await page
      .locator('.ag-root')
      .nth(sheets - 1)
      .waitFor()
}

for (const visit of visits) {
  test(`${visit.route} can be used by everybody, light, dark and on a phone, and prints no error`, async () => {
    const page = await windowOf(visit.as)
    await page.setViewportSize({ width: 1440, height: 900 })
    await page.emulateMedia({ colorScheme: 'light' })
    const answer = await page.goto(await visit.path(project))
    expect(answer?.status()).toBe(visit.refused ? 404 : 200)
    await settled(page)
    expect(await accessibilityFaults(page), 'light, 1440 pixels').toEqual([])
    await page.emulateMedia({ colorScheme: 'dark' })
    await settled(page)
    expect(await accessibilityFaults(page, { only: 'color-contrast' }), 'dark, 1440 pixels').toEqual([])
    await page.emulateMedia({ colorScheme: 'light' })
    await page.setViewportSize({ width: 390, height: 844 })
    await settled(page)
    // Colours are the same on a phone, and take longest to look at; but the client's page is another one there.
    const colours = visit.as === 'client' ? {} : { without: 'color-contrast' }
    expect(await accessibilityFaults(page, colours), 'light, 390 pixels').toEqual([])
    const overflow = await page.evaluate(() => document.documentElement.scrollWidth - window.innerWidth)
    expect(overflow, 'wider than a phone').toBeLessThanOrEqual(0)
    if (visit.refused) lavant.forgive(404)
    expect(lavant.troubles()).toEqual([])
  })
}
