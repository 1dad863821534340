import { request as send } from 'node:http'
import type { AddressInfo } from 'node:net'
import { buffer } from 'node:stream/consumers'
import express from 'express'
import { afterAll, expect, test } from 'vitest'
import { limitBody, mostFormBytes } from '../scripts/services/body-limit'

const app = express()
app.use(limitBody)
app.use(async (request, response) => {
  response.send(String((await buffer(request)).length))
})
const server = app.listen(0, '127.0.0.1')
afterAll(() => server.close())

function post(path: string, body: Buffer, headers: Record<string, string>): Promise<number> {
  return new Promise((resolve, reject) => {
    const { port } = server.address() as AddressInfo
    const outgoing = send({ host: '127.0.0.1', port, path, method: 'POST', headers }, (answer) => {
      answer.resume()
      resolve(answer.statusCode ?? 0)
    })
    // Once refused, the server closes the connection on whatever is still on its way.
    outgoing.on('error', (error: NodeJS.ErrnoException) => {
      if (error.code !== 'ECONNRESET' && error.code !== 'EPIPE') reject(error)
    })
    outgoing.end(body)
  })
}

const whole = (bytes: number) => ({ 'content-length': String(bytes) })

test('A form of the largest size passes, and one byte more does not, signed in or not', async () => {
  expect(await post('/sign-in', Buffer.alloc(mostFormBytes), whole(mostFormBytes))).toBe(200)
  expect(await post('/sign-in', Buffer.alloc(mostFormBytes + 1), whole(mostFormBytes + 1))).toBe(413)
  expect(await post('/sign-in.data', Buffer.alloc(mostFormBytes + 1), whole(mostFormBytes + 1))).toBe(413)
})

test('A body that hides its length is turned away where nobody counts it', async () => {
  const chunked = { 'transfer-encoding': 'chunked' }
  expect(await post('/sign-in/code', Buffer.from('code=1'), chunked)).toBe(411)
  expect(await post('/projects/1/readings/imports', Buffer.from('a,b'), chunked)).toBe(200)
})

test('Files, rows and model files may be longer: their routes count for themselves, under no other spelling', async () => {
  const bytes = mostFormBytes + 1
  const long = Buffer.alloc(bytes)
  for (const path of [
    '/projects/7/files?name=a.png',
    '/projects/7/rows',
    '/projects/7/readings/imports',
    '/api/v1/solve',
  ])
    expect(await post(path, long, whole(bytes)), path).toBe(200)
  for (const path of [
    '/projects/7/files.data',
    '/Projects/7/files',
    '/projects/7/files/',
    '/projects/7/readings/imports/3',
  ])
    expect(await post(path, long, whole(bytes)), path).toBe(413)
})
