import { randomUUID } from 'node:crypto'
import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { Readable } from 'node:stream'
import iconv from 'iconv-lite'
import type { Knex } from 'knex'
import { afterAll, beforeAll, beforeEach, describe, expect, test } from 'vitest'
import { listRows, saveRows } from '~/book/rows.server'
import { sectionStates } from '~/book/sections.server'
import { getVerified } from '~/files/files.server'
import { jobEnded } from '~/jobs/jobs.server'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson, makeProject } from '../../test/people'
import type { ImportSettings } from './import-settings'
import {
  discardImport,
  findImport,
  importFile,
  openImport,
  rowsLeftOut,
  settingsOfSameMake,
  startCommit,
  startPreview,
  undoImport,
} from './imports.server'
import type { Instrument } from './instrument'
import { readingKinds } from './reading-kinds.server'
import { lastReadings, latestReadings, measuredHeads, seriesOf } from './readings.server'

let fresh: FreshDatabase
let db: Knex
let userId: number
let project: { id: number; timeZone: string; units: { length: 'm'; time: 'd' } }
let count = 0

beforeAll(async () => {
  fresh = await freshDatabase()
  db = fresh.database
  userId = await makePerson(db, { name: 'Junior Engineer' })
})
afterAll(() => fresh.close())
beforeEach(async () => {
  const id = await makeProject(db, { number: `R-${++count}`, createdBy: userId })
  project = { id, timeZone: 'Europe/London', units: { length: 'm', time: 'd' } }
})

async function addInstrument(name: string, more: Partial<Instrument> = {}): Promise<string> {
  const id = randomUUID()
  const body = { name, kind: 'standpipe', x: 0, y: 0, ...more }
  await save([{ op: 'add', kind: 'instrument', id, body }])
  return id
}

async function addLevel(instrumentId: string, from: string, level: number): Promise<void> {
  const body = {
    instrumentId,
    from,
    level: { value: level, unit: 'm' },
    levelled: 'pipe top',
    reason: 'Survey',
  }
  await save([{ op: 'add', kind: 'reference level', id: randomUUID(), body }])
}

async function save(changes: Parameters<typeof saveRows>[1]['changes']) {
  const answer = await saveRows(db, { projectId: project.id, userId, changes, kinds: readingKinds })
  expect(answer).toMatchObject({ ok: true })
}

const dips: ImportSettings = {
  encoding: 'utf-8',
  delimiter: ',',
  headerRow: 1,
  instruments: { by: 'column', column: 0, names: {}, places: null },
  times: { by: 'columns', date: 1, time: null, order: null, timeIfNone: null },
  zone: { rule: 'utc' },
  value: { column: 2, quantity: 'dip', unit: 'm', decimalMark: null, status: null },
  header: ['point', 'time', 'dip'],
}

function take(content: string | Buffer, settings = dips, order?: Parameters<typeof importFile>[1]['order']) {
  return importFile(db, { project, userId, name: 'dips.csv', content, settings, order })
}

async function stateOfReadings() {
  const readings = await db('readings')
    .where({ project_id: project.id })
    .orderBy(['instrument_id', 'taken_at', 'revision'])
  const states = await sectionStates(db, project.id)
  const section = await db('book_sections')
    .where({ project_id: project.id, section: 'readings' })
    .first('digest')
  return { readings, digest: section?.digest, state: states.find((one) => one.key === 'readings')?.state }
}

const threeDips =
  'point,time,dip\nP1,2026-03-13 09:00,4.25\nP1,2026-03-14 09:00,4.3\np1 ,2026-03-15 09:00,dry\n'

describe('Two projects whose instruments carry the same id', () => {
  test('neither see nor supersede nor shut out the readings of each other', async () => {
    const id = await addInstrument('P1')
    await take(threeDips)
    const before = await stateOfReadings()
    const first = project
    project = { ...project, id: await makeProject(db, { number: `R-${++count}`, createdBy: userId }) }
    await save([{ op: 'add', kind: 'instrument', id, body: { name: 'P1', kind: 'standpipe', x: 0, y: 0 } }])
    const order = { conflicts: 'take new' as const, reason: 'Another site.' }
    const { receipt } = await take(threeDips.replace('4.25', '9.99'), dips, order)
    expect(receipt).toMatchObject({ counts: { accepted: 3, identical: 0, conflicts: 0 }, superseded: 0 })
    project = first
    expect(await stateOfReadings()).toEqual(before)
    const [last] = await lastReadings(db, project.id)
    expect(last?.count).toBe(3)
  })
})

describe('An import', () => {
  test('takes a file in, keeps it unchanged, and derives heads from the reference level in force', async () => {
    const id = await addInstrument('P1')
    await addLevel(id, '2026-01-01T00:00:00Z', 102.3)
    const { importId, receipt } = await take(threeDips)
    expect(receipt.counts).toEqual({ rows: 3, accepted: 3, identical: 0, conflicts: 0, refused: 0 })
    const record = await findImport(db, project.id, importId)
    expect(record?.state).toBe('committed')
    const stored = await getVerified(record?.file.key ?? '', record?.file.sha256 ?? '')
    expect(stored.toString()).toBe(threeDips)

    const [last] = await lastReadings(db, project.id)
    expect(last).toMatchObject({
      count: 3,
      last: { at: '2026-03-15T09:00:00.000Z', status: 'dry', head: null, why: 'dry' },
      lastHead: { at: '2026-03-14T09:00:00.000Z', head: 102.3 - 4.3 },
    })
    const heads = await measuredHeads(db, project.id, {
      from: new Date('2026-03-01'),
      to: new Date('2026-04-01'),
    })
    expect(heads).toMatchObject([
      { instrumentId: id, n: 2, head: expect.closeTo(102.3 - 4.275, 12), why: null },
    ])
    const nearest = { nearest: new Date('2026-03-13T20:00:00Z'), withinDays: 2 }
    expect(await measuredHeads(db, project.id, nearest)).toMatchObject([{ n: 1, head: 102.3 - 4.25 }])
    expect(
      await measuredHeads(db, project.id, { nearest: new Date('2026-06-01'), withinDays: 2 }),
    ).toMatchObject([{ n: 0, head: null, why: 'no reading' }])
    const [newest, second] = await latestReadings(db, project.id, id, 10)
    expect(newest).toMatchObject({ entered: 'dry', fileRow: 4, file: 'dips.csv', reference: null })
    expect(second).toMatchObject({ entered: '4.3', fileRow: 3, reference: { level: { value: 102.3 } } })
    const series = await seriesOf(db, project.id, id, { maxPoints: 100 })
    expect(series.lines).toMatchObject([{ quantity: 'dip', total: 2, gaps: [] }])
    expect(series.lines[0]?.points.map(([, head]) => head)).toEqual([102.3 - 4.25, 102.3 - 4.3])
    expect(series.marks).toMatchObject([{ word: 'dry', head: null }])
  })

  test('of the same file a second time adds nothing', async () => {
    await addInstrument('P1')
    await take(threeDips)
    const before = await db('readings').where({ project_id: project.id })
    const { receipt } = await take(threeDips)
    expect(receipt.counts).toEqual({ rows: 3, accepted: 0, identical: 3, conflicts: 0, refused: 0 })
    expect(await db('readings').where({ project_id: project.id })).toEqual(before)
  })

  test('can be undone whole: readings, section and instruments are as before', async () => {
    await addInstrument('P1')
    await take(threeDips)
    const before = await stateOfReadings()
    const settings: ImportSettings = {
      ...dips,
      instruments: {
        by: 'column',
        column: 0,
        names: { P2: 'add' },
        places: { x: 3, y: 4, unit: 'km', kind: 'standpipe piezometer' },
      },
    }
    const { importId, receipt } = await take(
      'point,time,dip,x,y\nP1,2026-03-14 09:00,9.9,0,0\nP2,2026-03-14 09:00,3,1.5,2.25\n',
      settings,
      { conflicts: 'take new', reason: 'The dip was written down wrongly.' },
    )
    expect(receipt).toMatchObject({ superseded: 1, counts: { accepted: 1, conflicts: 1 } })
    const added = (await listRows<Instrument>(db, project.id, 'instrument')).find(
      (row) => row.body.name === 'P2',
    )
    expect(added?.body).toMatchObject({ x: 1500, y: 2250, source: 'dips.csv' })
    expect(await stateOfReadings()).not.toEqual(before)

    const undone = await undoImport(db, { projectId: project.id, userId, importId })
    expect(undone).toEqual({ removed: 2, keptInstruments: [] })
    expect(await stateOfReadings()).toEqual(before)
    await expect(undoImport(db, { projectId: project.id, userId, importId })).rejects.toThrow('not in force')
  })

  test('keeps what is there when another value comes for the same time, and lists both', async () => {
    const id = await addInstrument('P1')
    await take(threeDips)
    const { importId, receipt } = await take('point,time,dip\nP1,2026-03-14 09:00,5.0\n')
    expect(receipt.counts).toEqual({ rows: 1, accepted: 0, identical: 0, conflicts: 1, refused: 0 })
    const record = await findImport(db, project.id, importId)
    expect(record?.preview?.conflictRows).toMatchObject([
      { row: 2, instrument: 'P1', entered: '5.0', existing: '4.3' },
    ])
    expect((await latestReadings(db, project.id, id, 5))[1]?.entered).toBe('4.3')
    if (!record) throw new Error('no record')
    expect(await rowsLeftOut(db, record)).toMatchObject([{ row: 2, outcome: 'conflict' }])
  })

  test('takes a new value only with a reason, as a new revision', async () => {
    const id = await addInstrument('P1')
    await take(threeDips)
    const wrong = 'point,time,dip\nP1,2026-03-14 09:00,5.0\n'
    await expect(take(wrong, dips, { conflicts: 'take new', reason: ' ' })).rejects.toThrow('Give the reason')
    await take(wrong, dips, { conflicts: 'take new', reason: 'Misread tape' })
    const readings = await latestReadings(db, project.id, id, 5)
    expect(readings.map((one) => [one.entered, one.revision])).toEqual([
      ['dry', 1],
      ['5.0', 2],
      ['4.25', 1],
    ])
  })

  test('refuses rows with their reason and number, and every row is accounted for', async () => {
    await addInstrument('P1', { installedOn: '2026-02-01' })
    const rows = [
      'point,time,dip',
      'P1,2026-03-14 09:00,4.25',
      'P9,2026-03-14 09:00,4.25',
      'P1,2026-03-32 09:00,4.25',
      'P1,2026-03-16,4.25',
      'P1,2026-03-17 09:00,4,25,',
      '',
      'P1,2026-01-31 23:59,4.25',
      'P1,2099-01-01 00:00,4.25',
      'P1,2026-03-18 09:00,',
      'P1,2026-03-14 09:00,4.26',
      'P1,2026-03-14 09:00,4.250',
      'P1,2026-03-19 09:00,<4.1',
    ]
    const { importId, receipt } = await take(rows.join('\r\n'))
    const record = await findImport(db, project.id, importId)
    expect(record?.preview?.refusedRows).toEqual([
      { row: 3, reason: 'No instrument is called "P9".', cells: 'P9' },
      { row: 4, reason: "The date can't be read (year first).", cells: '2026-03-32 09:00' },
      { row: 5, reason: 'There is no time of day: choose one for such rows.', cells: '2026-03-16' },
      { row: 8, reason: 'P1 was not installed yet.', cells: '2026-01-31 23:59' },
      { row: 9, reason: 'The time lies in the future.', cells: '2099-01-01 00:00' },
      { row: 10, reason: 'There is no value.', cells: '' },
      { row: 11, reason: 'Row 2 of this file has another value for the same time.', cells: '4.26' },
    ])
    expect(record?.preview).toMatchObject({
      blank: 1,
      bounds: 1,
      unknownNames: [{ name: 'P9', rows: 1 }],
      decimals: { chosen: 'point' },
    })
    expect(receipt.counts).toEqual({ rows: 11, accepted: 3, identical: 1, conflicts: 0, refused: 7 })
  })

  test('does not commit what changed since its preview', async () => {
    await addInstrument('P1')
    const content = Readable.from([Buffer.from(threeDips)])
    const importId = await openImport(db, { projectId: project.id, userId, name: 'dips.csv', body: content })
    const record = await findImport(db, project.id, importId)
    if (!record) throw new Error('no record')
    await jobEnded(await startPreview(db, { project, userId, record, settings: dips }))
    const previewed = await findImport(db, project.id, importId)
    await take(threeDips)
    const order = {
      conflicts: 'keep' as const,
      reason: null,
      counts: previewed?.preview?.counts ?? { rows: 0, accepted: 0, identical: 0, conflicts: 0, refused: 0 },
    }
    await jobEnded(await startCommit(db, { project, userId, record, order }))
    expect(await findImport(db, project.id, importId)).toMatchObject({
      state: 'previewed',
      error: expect.stringContaining('changed since this preview'),
      receipt: null,
    })
  })

  test('that was never committed can be discarded, file and all', async () => {
    const body = Readable.from([Buffer.from(threeDips)])
    const importId = await openImport(db, { projectId: project.id, userId, name: 'dips.csv', body })
    const record = await findImport(db, project.id, importId)
    await discardImport(db, { projectId: project.id, userId, importId })
    expect(await findImport(db, project.id, importId)).toBeUndefined()
    await expect(getVerified(record?.file.key ?? '', '')).rejects.toThrow()
  })

  test('of nothing, or of a workbook, is refused and leaves nothing behind', async () => {
    const files = () => db('files').where({ project_id: project.id })
    for (const [content, message] of [
      ['', 'The file is empty.'],
      ['PK\u0003\u0004zip', 'save the sheet as CSV'],
    ] as const) {
      const body = Readable.from([Buffer.from(content)])
      await expect(openImport(db, { projectId: project.id, userId, name: 'a.xlsx', body })).rejects.toThrow(
        message,
      )
    }
    expect(await files()).toEqual([])
  })

  test('with a quotation mark left open fails with the row that broke it', async () => {
    await addInstrument('P1')
    const broken =
      'point,time,dip\nP1,2026-03-14 09:00,4.25\nP1,"2026-03-15 09:00,4.25\nP1,2026-03-16 09:00,4\n'
    const body = Readable.from([Buffer.from(broken)])
    const importId = await openImport(db, { projectId: project.id, userId, name: 'dips.csv', body })
    const record = await findImport(db, project.id, importId)
    if (!record) throw new Error('no record')
    await jobEnded(await startPreview(db, { project, userId, record, settings: dips }))
    expect(await findImport(db, project.id, importId)).toMatchObject({
      state: 'failed',
      error: expect.stringContaining("Row 3 can't be read"),
    })
  })
})

describe('Dates and numbers of a file', () => {
  test('An ambiguous order of the date is asked, never guessed', async () => {
    await addInstrument('P1')
    const content = 'point,time,dip\nP1,03/04/2026 09:00,4.25\nP1,04/04/2026 09:00,4.26\n'
    await expect(take(content)).rejects.toThrow('Choose the date order first.')
    const chosen: ImportSettings = {
      ...dips,
      times: { by: 'columns', date: 1, time: null, order: 'day first', timeIfNone: null },
    }
    const { receipt } = await take(content, chosen)
    expect(receipt.instruments).toMatchObject([
      { firstAt: '2026-04-03T09:00:00.000Z', lastAt: '2026-04-04T09:00:00.000Z', low: 4.25, high: 4.26 },
    ])
  })

  test('On the day the clocks go back, the repeated hour follows the rule; in spring the missing hour is refused', async () => {
    const id = await addInstrument('P1')
    const site = (repeated: 'refuse' | 'in order'): ImportSettings => ({
      ...dips,
      zone: { rule: 'site', repeated },
    })
    const autumn = ['00:30', '01:00', '01:30', '01:00', '01:30', '02:00']
      .map((time, i) => `P1,2026-10-25 ${time},${4 + i / 10}`)
      .join('\n')
    const spring = 'P1,2026-03-29 00:30,5\nP1,2026-03-29 01:30,5\nP1,2026-03-29 02:00,5'
    const refused = await take(`point,time,dip\n${autumn}\n${spring}\n`, site('refuse'))
    expect(refused.receipt.counts).toMatchObject({ accepted: 4, refused: 5 })
    await undoImport(db, { projectId: project.id, userId, importId: refused.importId })
    const { receipt } = await take(`point,time,dip\n${spring}\n${autumn}\n`, site('in order'))
    expect(receipt.counts).toMatchObject({ accepted: 8, refused: 1 })
    const times = (await latestReadings(db, project.id, id, 8)).map((one) => one.at.slice(0, 16)).reverse()
    expect(times).toEqual([
      '2026-03-29T00:30',
      '2026-03-29T01:00',
      '2026-10-24T23:30',
      '2026-10-25T00:00',
      '2026-10-25T00:30',
      '2026-10-25T01:00',
      '2026-10-25T01:30',
      '2026-10-25T02:00',
    ])
  })

  test('Semicolons, decimal commas and UTF-16 with a header block arrive as the numbers they are', async () => {
    const id = await addInstrument('Meßstelle 1')
    const text =
      'Logger;7\r\nSeriennummer;S-12\r\n\r\nDatum;Uhrzeit;Wasserstand\r\n13.03.2026;09:00;12,5\r\n14.03.2026;09:00;1.012,25\r\n'
    const settings: ImportSettings = {
      ...dips,
      encoding: 'utf-16le',
      delimiter: ';',
      headerRow: 4,
      instruments: { by: 'one', instrumentId: id },
      times: { by: 'columns', date: 0, time: 1, order: null, timeIfNone: null },
      value: { column: 2, quantity: 'level', unit: 'm', decimalMark: null, status: null },
    }
    await take(iconv.encode(text, 'utf-16le', { addBOM: true }), settings)
    const readings = await latestReadings(db, project.id, id, 5)
    expect(readings.map((one) => [one.head, one.entered, one.fileRow])).toEqual([
      [1012.25, '1.012,25', 6],
      [12.5, '12,5', 5],
    ])
  })

  test('Feet and kilopascals are converted exactly and kept as entered', async () => {
    const id = await addInstrument('P1')
    await addLevel(id, '2026-01-01T00:00:00Z', 100)
    const feet: ImportSettings = { ...dips, value: { ...dips.value, unit: 'ft' } }
    await take('point,time,dip\nP1,2026-03-13 09:00,10\n', feet)
    expect(await latestReadings(db, project.id, id, 1)).toMatchObject([
      { entered: '10', unit: 'ft', head: expect.closeTo(100 - 3.048, 12) },
    ])
  })
})

test('100 000 rows go through on a thread with progress, and the same file again adds none', {
  timeout: 300_000,
}, async () => {
  const ids = [await addInstrument('P1'), await addInstrument('P2')]
  await addLevel(ids[0] ?? '', '2020-01-01T00:00:00Z', 100)
  const start = Date.UTC(2023, 0, 1)
  const lines = Array.from({ length: 100_000 }, (_, i) => {
    const at = new Date(start + Math.floor(i / 2) * 900_000).toISOString().slice(0, 16).replace('T', ' ')
    return `P${(i % 2) + 1},${at},${(5 + Math.sin(i / 5000)).toFixed(3)}`
  })
  const content = `point,time,dip\n${lines.join('\n')}\n`
  const open = async () => {
    const body = Readable.from([Buffer.from(content)])
    const importId = await openImport(db, { projectId: project.id, userId, name: 'logger.csv', body })
    const record = await findImport(db, project.id, importId)
    if (!record) throw new Error('no record')
    return record
  }
  const site: ImportSettings = { ...dips, zone: { rule: 'site', repeated: 'in order' } }
  const first = await open()
  // Winter and summer by a fixed offset, so that no hour is missing.
  const settings: ImportSettings = { ...site, zone: { rule: 'offset', minutes: 60 } }
  const jobId = await startPreview(db, { project, userId, record: first, settings })
  let told = 0
  const watch = setInterval(() => {
    void db('jobs')
      .where({ id: jobId })
      .first('progress')
      .then((job) => {
        if (job?.progress) told++
      })
  }, 100)
  await jobEnded(jobId)
  clearInterval(watch)
  expect(told).toBeGreaterThan(0)
  const counts = { rows: 100_000, accepted: 100_000, identical: 0, conflicts: 0, refused: 0 }
  expect((await findImport(db, project.id, first.id))?.preview?.counts).toEqual(counts)
  const order = { conflicts: 'keep' as const, reason: null, counts }
  await jobEnded(await startCommit(db, { project, userId, record: first, order }))
  expect((await findImport(db, project.id, first.id))?.receipt?.counts).toEqual(counts)
  const [stored] = await db('readings').where({ project_id: project.id }).count('* as rows')
  expect(stored?.rows).toBe(100_000)

  const second = await open()
  await jobEnded(await startPreview(db, { project, userId, record: second, settings }))
  expect((await findImport(db, project.id, second.id))?.preview?.counts).toEqual({
    ...counts,
    accepted: 0,
    identical: 100_000,
  })
  const series = await seriesOf(db, project.id, ids[0] ?? '', { maxPoints: 1000 })
  expect(series.lines[0]?.total).toBe(50_000)
  expect(series.lines[0]?.points.length).toBeLessThanOrEqual(1000)
  expect(await settingsOfSameMake(db, project.id, dips.header)).toMatchObject({ file: 'logger.csv' })
})

test('OD-01: the 85 measured heads of a real aquifer become 85 instruments with their levels', async () => {
  // Harper and Furr (1986), Battelle report BMI/ONWI-587; heads in m, coordinates in km.
  const content = readFileSync(join(import.meta.dirname, '../../test/checks/data/wolfcamp_heads.csv'))
  const settings: ImportSettings = {
    ...dips,
    instruments: {
      by: 'row',
      prefix: 'W',
      places: { x: 0, y: 1, unit: 'km', kind: 'standpipe piezometer' },
    },
    times: { by: 'fixed', date: '1980-01-01', time: '12:00' },
    value: { column: 2, quantity: 'level', unit: 'm', decimalMark: null, status: null },
  }
  const { importId, receipt } = await take(content, settings)
  expect(receipt.counts).toEqual({ rows: 85, accepted: 85, identical: 0, conflicts: 0, refused: 0 })
  const on = { from: new Date('1979-12-31'), to: new Date('1980-01-02') }
  const heads = await measuredHeads(db, project.id, on)
  expect(heads).toHaveLength(85)
  expect(heads[0]).toMatchObject({ name: 'W-01', head: 446.219025, n: 1 })
  expect(heads[0]?.x).toBeCloseTo(68_851.186, 6)
  const values = heads.map((one) => one.head ?? Number.NaN)
  expect(Math.min(...values)).toBeCloseTo(312.10948, 4)
  expect(Math.max(...values)).toBeCloseTo(1088.4209, 4)
  expect(values.reduce((sum, value) => sum + value, 0) / 85).toBeCloseTo(610.28448, 4)

  expect((await take(content, settings)).receipt.counts).toMatchObject({ accepted: 0, identical: 85 })
  await undoImport(db, { projectId: project.id, userId, importId })
  expect(await listRows(db, project.id, 'instrument')).toEqual([])
})

test('An instrument with readings can not be deleted, and two can not share a name', async () => {
  const id = await addInstrument('P1')
  await take(threeDips)
  const change = { op: 'delete', kind: 'instrument', id, version: 1 } as const
  const order = { projectId: project.id, userId, kinds: readingKinds }
  expect(await saveRows(db, { ...order, changes: [change] })).toMatchObject({
    ok: false,
    problems: [{ id, message: expect.stringContaining('has readings') }],
  })
  const twin = {
    op: 'add',
    kind: 'instrument',
    id: randomUUID(),
    body: { name: 'p1', kind: 'logger', x: 1, y: 1 },
  } as const
  expect(await saveRows(db, { ...order, changes: [twin] })).toMatchObject({
    ok: false,
    problems: [{ field: 'name' }],
  })
  expect(await listRows(db, project.id, 'instrument')).toHaveLength(1)
})
