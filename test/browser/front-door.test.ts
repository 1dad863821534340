import { request } from 'node:http'
import { expect, test } from 'vitest'

const address = process.env.LAVANT_TEST_ADDRESS ?? ''

const everywhere = {
  'x-content-type-options': 'nosniff',
  'x-frame-options': 'DENY',
  'referrer-policy': 'same-origin',
  'cross-origin-opener-policy': 'same-origin',
  'cross-origin-resource-policy': 'same-origin',
}

async function signInPage(): Promise<{ answer: Response; html: string }> {
  const answer = await fetch(`${address}/sign-in`)
  return { answer, html: await answer.text() }
}

test('A page carries the security headers, and a policy with a nonce that is new each time', async () => {
  const first = await signInPage()
  const second = await signInPage()
  expect(first.answer.status).toBe(200)
  expect(Object.fromEntries(first.answer.headers)).toMatchObject(everywhere)
  expect(first.answer.headers.get('x-powered-by')).toBeNull()
  const [one, other] = [first, second].map(
    ({ answer }) => /'nonce-([^']+)'/.exec(answer.headers.get('content-security-policy') ?? '')?.[1],
  )
  expect(one).toMatch(/^[\w+/=-]{20,}$/)
  expect(other).not.toBe(one)
  expect(first.html).toContain(`nonce="${one}"`)
})

test('Assets carry the security headers too, and may be kept for ever', async () => {
  const { html } = await signInPage()
  const paths = [...new Set(html.match(/\/assets\/[\w.-]+\.(?:js|css)/g))]
  expect(paths.length).toBeGreaterThan(2)
  for (const path of paths) {
    const answer = await fetch(address + path)
    expect(answer.status, path).toBe(200)
    expect(Object.fromEntries(answer.headers), path).toMatchObject(everywhere)
    expect(answer.headers.get('cache-control'), path).toContain('immutable')
  }
})

test('An asset that is not there is not found, without a page being made for it', async () => {
  const answer = await fetch(`${address}/assets/gone-0123.js`)
  expect(answer.status).toBe(404)
  expect(answer.headers.get('content-type')).toContain('text/plain')
})

test('The demo answers nobody who calls this machine by another name', async () => {
  const status = await new Promise((resolve, reject) => {
    request(`${address}/mail`, { headers: { Host: 'elsewhere.example' } }, (answer) => {
      answer.resume()
      resolve(answer.statusCode)
    })
      .on('error', reject)
      .end()
  })
  expect(status).toBe(421)
})
