import AxeBuilder from '@axe-core/playwright'
import {
  type Browser,
  type BrowserContext,
  chromium,
  type Locator,
  type Page,
  request,
} from 'playwright-core'
import { readMailbox } from '../../app/mail/mailbox.server.ts'
import { demoPeople } from '../../database/seeds/people.ts'

/** Where the built application is served, with the demo in its database. */
export const address = process.env.LAVANT_TEST_ADDRESS ?? ''

export type DemoRole = (typeof demoPeople)[number]['role']
type Session = Awaited<ReturnType<BrowserContext['storageState']>>

interface PageOptions {
  width?: number
  height?: number
  dark?: boolean
}

export interface Lavant {
  browser: Browser
  /** A new window of somebody of the demo, signed in; every window of a person is of one and the same session. */
  as: (role: DemoRole, options?: PageOptions) => Promise<Page>
  /** A new window of nobody. */
  stranger: (options?: PageOptions) => Promise<Page>
  /** What the pages printed as errors, or threw, since the last call. */
  troubles: () => string[]
  /** The browser prints each refusal of the server as an error; a test that provokes one says so. */
  forgive: (status: number) => void
  close: () => Promise<void>
}

/** Opens a browser for the tests of one file. Call `close` when they are over. */
export async function openLavant(): Promise<Lavant> {
  if (!address) throw new Error('Browser tests need the built application: run npm test -- browser.')
  const browser = await chromium.launch({
    executablePath: process.env.LAVANT_CHROMIUM ?? '/usr/bin/chromium',
    args: [
      '--no-sandbox',
      '--disable-gpu',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  })
  const sessions = new Map<DemoRole, Session>()
  let printed: string[] = []
  const forgiven = new Set<number>()

  async function open(session: Session | undefined, options: PageOptions = {}): Promise<Page> {
    const { width = 1600, height = 1000, dark = false } = options
    const context = await browser.newContext({
      baseURL: address,
      viewport: { width, height },
      colorScheme: dark ? 'dark' : 'light',
      acceptDownloads: true,
      reducedMotion: 'reduce',
      ...(session ? { storageState: session } : {}),
    })
    context.setDefaultTimeout(60_000)
    context.on('console', (message) => {
      if (message.type() === 'error') printed.push(`${message.page()?.url()}: ${message.text()}`)
    })
    context.on('weberror', (failure) => {
      printed.push(`${failure.page()?.url()}: ${failure.error().stack ?? failure.error().message}`)
    })
    return context.newPage()
  }

  return {
    browser,
    async as(role, options) {
      const session = sessions.get(role) ?? (await signIn(emailOf(role)))
      sessions.set(role, session)
      return open(session, options)
    },
    stranger: (options) => open(undefined, options),
    troubles() {
      const unexpected = printed.filter(
        (line) => ![...forgiven].some((status) => line.includes(`responded with a status of ${status}`)),
      )
      printed = []
      forgiven.clear()
      return unexpected
    },
    forgive: (status) => forgiven.add(status),
    close: () => browser.close(),
  }
}

export function personOf(role: DemoRole) {
  const person = demoPeople.find((one) => one.role === role)
  if (!person) throw new Error(`The demo has nobody as ${role}.`)
  return person
}

export function emailOf(role: DemoRole): string {
  return personOf(role).email
}

/** Signs somebody in by code, as a browser without scripts would, and returns the cookies. */
async function signIn(email: string): Promise<Session> {
  const client = await request.newContext({ baseURL: address, extraHTTPHeaders: { Origin: address } })
  const asked = new Date()
  await client.post('/sign-in', { form: { email } })
  const answer = await client.post('/sign-in/code', {
    form: { code: await codeFor(email, asked) },
    maxRedirects: 0,
  })
  if (answer.status() !== 302) throw new Error(`${email} could not sign in: ${answer.status()}`)
  const session = await client.storageState()
  await client.dispose()
  return session
}

/** The sign-in code that was mailed to an address since `asked`. */
export async function codeFor(email: string, asked: Date): Promise<string> {
  const text = await mailTo(email, asked, /\b\d{6}\b/)
  return /\b\d{6}\b/.exec(text)?.[0] ?? ''
}

/** The newest mail to an address since `asked` whose text matches. Waits for it half a minute. */
export async function mailTo(email: string, asked: Date, pattern: RegExp): Promise<string> {
  const folder = process.env.LAVANT_MAILBOX
  if (!folder) throw new Error('LAVANT_MAILBOX is missing: the folder with received mail.')
  for (let patience = 150; patience > 0; patience--) {
    const mails = await readMailbox(folder, 20)
    const found = mails.find(
      (mail) => mail.to.includes(email) && new Date(mail.at) >= asked && pattern.test(mail.text),
    )
    if (found) return found.text
    await new Promise((resolve) => setTimeout(resolve, 200))
  }
  throw new Error(`No mail to ${email} came that matches ${pattern}.`)
}

/** Path of the demo's project, as its members find it in their list. */
export async function demoProjectPath(page: Page): Promise<string> {
  const answer = await page.request.get('/projects')
  const html = await answer.text()
  const title = html.indexOf('Tarrow Quay deep shaft')
  const links = [...html.slice(0, title).matchAll(/href="(\/projects\/\d+)"/g)]
  const path = links.at(-1)?.[1]
  if (!path) throw new Error('The demo’s project is not in the list.')
  return path
}

/** The text of an element, its white space as one blank each. */
export async function textOf(place: Locator): Promise<string> {
  return ((await place.textContent()) ?? '').replaceAll(/\s+/g, ' ').trim()
}

/** What axe finds wrong with the page as it stands, a line each; by one rule only, or without one. */
export async function accessibilityFaults(
  page: Page,
  { only, without }: { only?: string; without?: string } = {},
): Promise<string[]> {
  // No page has frames, so the findings need not be brought together in a page of their own.
  const axe = new AxeBuilder({ page }).setLegacyMode().options({
    resultTypes: ['violations'],
    ...(only ? { runOnly: { type: 'rule', values: [only] } } : {}),
    ...(without ? { rules: { [without]: { enabled: false } } } : {}),
  })
  const { violations } = await axe.analyze()
  return violations.flatMap(({ id, nodes }) =>
    nodes.map((node) => `${id}: ${node.target.join(' ')}: ${node.failureSummary?.replaceAll(/\s+/g, ' ')}`),
  )
}
