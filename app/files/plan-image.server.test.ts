import { readFileSync } from 'node:fs'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { type FreshDatabase, freshDatabase } from '../../test/database.ts'
import { makePerson, makeProject } from '../../test/people.ts'
import { findFile, getObjectStream, getVerifiedStream, putBuffer } from './files.server'
import { planImageLimits, storePlanImage } from './plan-image.server'

const sitePlan = readFileSync(new URL('../../database/seeds/site-plan.png', import.meta.url))

let fresh: FreshDatabase
let userId: number
let projectId: number

beforeAll(async () => {
  fresh = await freshDatabase()
  userId = await makePerson(fresh.database, { name: 'Hydrogeologist' })
  projectId = await makeProject(fresh.database, { number: 'PLAN-1', createdBy: userId })
})
afterAll(() => fresh.close())

function bodyOf(...pieces: Uint8Array[]): ReadableStream<Uint8Array> {
  return new ReadableStream({
    start(controller) {
      for (const piece of pieces) controller.enqueue(piece)
      controller.close()
    },
  })
}

function store(body: ReadableStream<Uint8Array> | null, name = 'plan.png') {
  return storePlanImage(fresh.database, { projectId, userId, name, body })
}

async function storedFiles(): Promise<number> {
  const [row] = await fresh.database('files').count({ n: '*' })
  return Number(row?.n)
}

describe('a plan image sent in pieces', () => {
  it('is stored byte for byte, with its size in pixels and its SHA-256', async () => {
    const answer = await store(bodyOf(sitePlan.subarray(0, 10), sitePlan.subarray(10)), 'Site plan.svg')
    if (!answer.ok) throw new Error(answer.message)
    expect(answer).toMatchObject({ width: 1600, height: 1100, contentType: 'image/png' })
    const file = await findFile(fresh.database, projectId, answer.fileId)
    expect(file).toMatchObject({ kind: 'plan image', name: 'Site plan.svg', content_type: 'image/png' })
    const chunks: Buffer[] = []
    for await (const chunk of await getVerifiedStream(file?.s3_key ?? '', answer.sha256)) chunks.push(chunk)
    expect(Buffer.concat(chunks).equals(sitePlan)).toBe(true)
  })
})

describe('what is no plan image', () => {
  it('is refused by its content and leaves nothing behind', async () => {
    const before = await storedFiles()
    expect(await store(bodyOf(Buffer.from('<svg/>')))).toMatchObject({ ok: false, status: 415 })
    expect(await store(null)).toMatchObject({ ok: false, status: 415 })
    expect(await store(bodyOf(sitePlan.subarray(0, 24)))).toMatchObject({ ok: false, status: 422 })
    expect(await storedFiles()).toBe(before)
  })

  it('is refused when it has too many pixels for a browser to hold', async () => {
    const huge = Buffer.from(sitePlan)
    huge.writeUInt32BE(8001, 16)
    huge.writeUInt32BE(5000, 20)
    const answer = await store(bodyOf(huge))
    expect(answer).toMatchObject({ ok: false, status: 422 })
    expect(answer.ok || answer.message).toMatch('8001 by 5000')
  })

  it('is refused past 20 MB without being read to its end', async () => {
    let sent = 0
    const endless = new ReadableStream<Uint8Array>({
      pull(controller) {
        sent += 1_048_576
        controller.enqueue(new Uint8Array(1_048_576))
      },
    })
    expect(await store(endless)).toMatchObject({ ok: false, status: 413 })
    expect(sent).toBeLessThan(planImageLimits.bytes + 4 * 1_048_576)
  })
})

describe('a stored object that was damaged', () => {
  it('breaks off on its way out instead of arriving whole', async () => {
    const stored = await putBuffer(Buffer.alloc(300_000, 7), { folder: 'test', contentType: 'text/plain' })
    const wrong = '0'.repeat(64)
    let arrived = 0
    await expect(async () => {
      for await (const chunk of await getVerifiedStream(stored.key, wrong))
        arrived += (chunk as Buffer).length
    }).rejects.toThrow('damaged')
    expect(arrived).toBeLessThan(stored.bytes)
    let whole = 0
    for await (const chunk of await getObjectStream(stored.key)) whole += (chunk as Buffer).length
    expect(whole).toBe(stored.bytes)
  })
})
