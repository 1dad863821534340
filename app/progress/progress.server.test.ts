import { randomUUID } from 'node:crypto'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { listRows } from '~/book/rows.server'
import type { Run } from '~/heads/runs.server'
import { gatherContent } from '~/packages/gather.server'
import type { PackageStatus } from '~/packages/title-block'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson } from '../../test/people'
import { add, makeStrip, type Strip, stripInstrument, takeDip } from '../../test/strip'
import { againstPrediction, ageWords, presentHead } from './progress'
import { progressView } from './progress.server'

const secret = 'wordthatnoclientmayread'

let fresh: FreshDatabase
let strip: Strip
let run: Run
let originator = 0
const ids = { a: randomUUID(), dry: randomUUID() }

async function putPackage(revision: string, status: PackageStatus, purpose: string): Promise<void> {
  const content = await gatherContent(fresh.database, strip.project, { runId: run.id, fitDate: '2026-03-12' })
  const published = status === 'issued' || status === 'superseded'
  await fresh.database('packages').insert({
    project_id: strip.project.id,
    revision,
    status,
    purpose,
    reason: secret,
    run_id: run.id,
    gathered: JSON.stringify(content),
    input_sha256: 'a'.repeat(64),
    pdf_sha256: published ? 'b'.repeat(64) : null,
    created_at: new Date('2026-03-13T10:00:00Z'),
    created_by: originator,
    issued_at: published ? new Date('2026-03-14T10:00:00Z') : null,
  })
}

beforeAll(async () => {
  fresh = await freshDatabase()
  originator = await makePerson(fresh.database, { name: `O. ${secret}` })
  strip = await makeStrip(fresh.database, { number: 'P-1', originator })
  const { project, save } = strip
  const source = secret
  await save([
    ...stripInstrument('A', 500, ids.a, { pointId: strip.ids.point, serial: secret, source }),
    ...stripInstrument('D', 225, ids.dry),
    add('basis', {
      question: secret,
      accuracy: secret,
      intendedUse: secret,
      notFor: secret,
      idealisation: secret,
      conclusions: secret,
    }),
    add('assumption', { reference: 'A1', statement: secret, why: secret, effect: secret, source }),
    add('standard', { title: secret, edition: secret, use: secret }),
    add('recharge zone', { name: secret, rate: { value: 0, unit: 'mm/d' }, source }),
    add('estimate', { result: secret, method: secret, working: secret, value: 1, unit: 'm', source }),
  ])
  const [levels] = await listRows<{ reason: string }>(fresh.database, project.id, 'reference level')
  await save([
    {
      op: 'edit',
      kind: 'reference level',
      id: levels?.id ?? '',
      version: levels?.version ?? 0,
      body: { ...levels?.body, reason: secret, source },
    },
  ])
  run = await strip.compute()
  const dip = (instrumentId: string, at: string, value: number | null, status?: string) =>
    takeDip(fresh.database, { projectId: project.id, instrumentId, at, dip: value, status })
  await dip(ids.a, '2026-03-12T10:00:00Z', 3.9)
  await dip(ids.dry, '2026-03-12T10:00:00Z', 3.5)
  await dip(ids.dry, '2026-03-20T10:00:00Z', null, 'dry')
  await putPackage('P01', 'superseded', 'Tender')
  await putPackage('P02', 'issued', 'Approval of the pumping')
  await putPackage('P03', 'withdrawn', secret)
  await putPackage('P04', 'approved', secret)
  await fresh
    .database('projects')
    .where({ id: project.id })
    .update({ stage: 'Pumping', next_step: 'Reading on Friday' })
  await fresh.database('history').insert({
    project_id: project.id,
    at: new Date(),
    user_id: originator,
    action: secret,
    subject: secret,
    reason: secret,
  })
}, 120_000)
afterAll(() => fresh.close())

/** Every string and every key of a value, however deep. */
function wordsIn(value: unknown): string[] {
  if (typeof value === 'string') return [value]
  if (value === null || typeof value !== 'object') return []
  return Object.entries(value).flatMap(([key, inner]) => [key, ...wordsIn(inner)])
}

describe('What a client receives', () => {
  it('holds nothing that colleagues wrote to one another', async () => {
    const view = await progressView(fresh.database, strip.project)
    expect(wordsIn(view).filter((word) => word.includes(secret))).toEqual([])
    // The words were there to be found.
    const held = await gatherContent(fresh.database, strip.project, { runId: run.id })
    expect(wordsIn(held).filter((word) => word.includes(secret)).length).toBeGreaterThan(12)
  })

  it('is these fields and no other', async () => {
    const { project, issued, instruments, fit, ...rest } = await progressView(fresh.database, strip.project)
    expect(Object.keys(rest).sort()).toEqual(['nextStep', 'stage'])
    expect(Object.keys(project).sort()).toEqual(['client', 'levels', 'number', 'timeZone', 'title', 'unit'])
    for (const line of issued) {
      expect(Object.keys(line).sort()).toEqual(['id', 'issuedAt', 'purpose', 'revision', 'sha256', 'status'])
    }
    for (const line of instruments) {
      expect(Object.keys(line).sort()).toEqual([
        'at',
        'head',
        'headAt',
        'name',
        'outOfService',
        'predicted',
        'quality',
        'status',
      ])
    }
    expect(Object.keys(fit ?? {}).sort()).toEqual(['day', 'largest', 'n', 'typical'])
  })

  it('names issued and superseded documents only', async () => {
    const { issued } = await progressView(fresh.database, strip.project)
    expect(issued.map(({ revision, status }) => `${revision} ${status}`)).toEqual([
      'P02 issued',
      'P01 superseded',
    ])
  })

  it('holds the last reading of each instrument against the issued prediction', async () => {
    const { instruments, fit } = await progressView(fresh.database, strip.project)
    expect(instruments).toMatchObject([
      { name: 'A', head: expect.closeTo(11.1, 9), predicted: expect.closeTo(11, 6), status: null },
      { name: 'D', head: expect.closeTo(11.5, 9), status: 'dry', at: '2026-03-20T10:00:00.000Z' },
    ])
    // Dry now: the head of the week before is no present level.
    expect(instruments.map(presentHead)).toEqual([expect.closeTo(11.1, 9), null])
    expect(fit).toMatchObject({ n: 2, typical: expect.closeTo(0.075, 6), largest: expect.closeTo(0.1, 6) })
  })
})

describe('Plain words for a client', () => {
  it('say how old a reading is', () => {
    const now = Date.parse('2026-03-31T12:00:00Z')
    const age = (at: string | null) => ageWords(at, now, 'Europe/London')
    expect(age(null)).toBe('never read')
    expect(age('2026-03-31T06:00:00Z')).toBe('today')
    expect(age('2026-03-30T23:30:00Z')).toBe('today')
    expect(age('2026-03-30T10:00:00Z')).toBe('yesterday')
    expect(age('2026-03-28T10:00:00Z')).toBe('3 days ago')
    expect(age('2026-03-10T10:00:00Z')).toBe('3 weeks ago')
    expect(age('2025-12-31T10:00:00Z')).toBe('3 months ago')
  })

  it('say how a level stands to the prediction, with a shape for each', () => {
    expect(againstPrediction(11.1, 11, 0.3)).toEqual({ words: 'as predicted', shape: '●' })
    expect(againstPrediction(11.4, 11, 0.3)).toEqual({ words: 'higher than predicted', shape: '▲' })
    expect(againstPrediction(10.6, 11, 0.3)).toEqual({ words: 'lower than predicted', shape: '▼' })
    expect(againstPrediction(null, 11, 0.3)).toEqual({ words: 'nothing to compare', shape: '–' })
  })
})
