import { existsSync, mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { createServer, type Server } from 'node:http'
import type { AddressInfo } from 'node:net'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { chromium } from 'playwright-core'
import { build } from 'vite'
import type { LiveTime } from './live.ts'
import type { Kind } from './problems.ts'

const program = '/usr/bin/chromium'
const quiet = [
  '--no-sandbox',
  '--disable-gpu',
  '--disable-quic',
  '--no-first-run',
  '--disable-background-networking',
  '--disable-component-update',
  '--disable-sync',
]

const page = `<!doctype html><title>bench</title>`

function serve(folder: string, kernels: string): Promise<Server> {
  const files: Record<string, [type: string, path: string | null]> = {
    '/': ['text/html', null],
    '/live.js': ['text/javascript', join(folder, 'live.js')],
    '/solver.wasm': ['application/wasm', kernels],
  }
  const server = createServer((request, response) => {
    const file = files[request.url ?? '']
    if (!file) {
      response.writeHead(404).end()
      return
    }
    response.writeHead(200, { 'content-type': file[0] }).end(file[1] ? readFileSync(file[1]) : page)
  })
  return new Promise((resolve) => server.listen(0, '127.0.0.1', () => resolve(server)))
}

/** moveOneWell in headless Chromium's web worker; null where there is no Chromium. `kernels`: path of solver.wasm. */
export async function moveOneWellInBrowser(
  kernels: string,
  kinds: Kind[],
  n: number,
  moves: number,
): Promise<LiveTime[] | null> {
  if (!existsSync(program)) return null
  const folder = mkdtempSync(join(tmpdir(), 'lavant-bench-'))
  await build({
    configFile: false,
    logLevel: 'error',
    build: {
      outDir: folder,
      emptyOutDir: true,
      lib: {
        entry: join(dirname(fileURLToPath(import.meta.url)), 'live.worker.ts'),
        formats: ['es'],
        fileName: () => 'live.js',
      },
    },
  })
  const server = await serve(folder, kernels)
  const browser = await chromium.launch({ executablePath: program, args: quiet })
  try {
    const tab = await browser.newPage()
    const address = `http://127.0.0.1:${(server.address() as AddressInfo).port}`
    await tab.goto(address)
    const told = { kernels: `${address}/solver.wasm`, kinds, n, moves }
    return await tab.evaluate(
      (request) =>
        new Promise<LiveTime[]>((resolve, reject) => {
          const worker = new Worker('/live.js', { type: 'module' })
          worker.onmessage = ({ data }) => resolve(data)
          worker.onerror = (event) => reject(new Error(event.message))
          worker.postMessage(request)
        }),
      told,
    )
  } finally {
    await browser.close()
    server.close()
    rmSync(folder, { recursive: true, force: true })
  }
}
