import type { APIResponse, Page } from 'playwright-core'
import { address } from './lavant.ts'

/** Sends a form as the page of the same person would, for what a test needs but is not about. */
export async function post(page: Page, path: string, form: Record<string, string>): Promise<APIResponse> {
  const answer = await page.request.post(path, { form, headers: { Origin: address }, maxRedirects: 0 })
  if (answer.status() >= 400) throw new Error(`${path} answered ${answer.status()}: ${await answer.text()}`)
  return answer
}

interface AddedRow {
  kind: string
  id: string
  body: unknown
}

/** Adds rows to the book, as sheets and drawings do. */
export async function addRows(page: Page, project: string, rows: readonly AddedRow[]): Promise<void> {
  const answer = await page.request.post(`${project}/rows`, {
    data: { changes: rows.map((row) => ({ op: 'add', ...row })) },
    headers: { Origin: address },
  })
  if (!answer.ok()) throw new Error(`The rows were refused: ${await answer.text()}`)
}

/** A new project of the firm with its administrator in charge and these members. Returns its path. */
export async function newProject(
  administrator: Page,
  settings: { number: string; title: string },
  members: readonly { email: string; role: string }[],
): Promise<string> {
  const made = await post(administrator, '/projects/new', {
    ...settings,
    client: 'County water board',
    calcReference: `GW-${settings.number}`,
    crsEpsg: '32614',
    verticalDatum: 'above mean sea level',
    timeZone: 'America/Chicago',
    lengthUnit: 'm',
    timeUnit: 'd',
  })
  const path = (made.headers().location ?? '').replace(/\/settings$/, '')
  if (!/^\/projects\/\d+$/.test(path)) throw new Error(`The project was not made: ${made.status()}`)
  for (const { email, role } of members)
    await post(administrator, `${path}/settings`, { intent: 'invite', email, role })
  return path
}
