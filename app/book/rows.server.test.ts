import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { rowKinds } from '~/row-kinds.server'
import type { Database } from '~database/connection.server'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson, makeProject } from '../../test/people'
import type { RowChange } from './row'
import { listRows, listUses, saveRows } from './rows.server'
import type { SectionKey } from './sections'
import { checkSection, sectionStatus } from './sections.server'

let fresh: FreshDatabase
let db: Database
let ann: number
let tom: number
let site: number
let otherSite: number

beforeAll(async () => {
  fresh = await freshDatabase()
  db = fresh.database
  ann = await makePerson(db, { name: 'Ann' })
  tom = await makePerson(db, { name: 'Tom' })
  site = await makeProject(db, { number: 'R-1', createdBy: ann })
  otherSite = await makeProject(db, { number: 'R-2', createdBy: ann })
})

afterAll(() => fresh.close())

function save(changes: RowChange[], userId = ann, projectId = site) {
  return saveRows(db, { projectId, userId, changes, kinds: rowKinds })
}

function well(name: string, rate = 190) {
  return { name, x: 100, y: 50, kind: 'abstraction', rate: { value: rate, unit: 'm3/d' } }
}

const sand = { name: 'Sand', kx: { value: 12, unit: 'm/d' }, ky: { value: 12, unit: 'm/d' } }
const base = { value: -10, unit: 'm' }

async function add(kind: string, body: unknown, projectId = site): Promise<string> {
  const id = crypto.randomUUID()
  const answer = await save([{ op: 'add', kind, id, body }], ann, projectId)
  expect(answer).toEqual({ ok: true, rows: [{ id, version: 1 }] })
  return id
}

describe('a kind of row', () => {
  it('that is none is refused by name, also where every object has something of that name', async () => {
    for (const kind of ['pump', 'constructor', '__proto__']) {
      const answer = await save([{ op: 'add', kind, id: crypto.randomUUID(), body: {} }])
      expect(answer).toMatchObject({
        ok: false,
        problems: [{ message: `There is no kind of row called "${kind}" here.` }],
      })
    }
  })
})

describe('two people who edit the same well', () => {
  it('the second is shown both values, and nothing of either is lost', async () => {
    const id = await add('well', well('W1'))
    const first = await save([{ op: 'edit', kind: 'well', id, version: 1, body: well('W1', 210) }], tom)
    expect(first.ok).toBe(true)
    const mine = well('W1', 500)
    const second = await save([{ op: 'edit', kind: 'well', id, version: 1, body: mine }])
    expect(second).toMatchObject({
      ok: false,
      problems: [],
      conflicts: [{ id, theirs: { version: 2, by: 'Tom', body: { rate: { value: 210 } } }, yours: mine }],
    })
    expect((await listRows(db, site, 'well')).find((row) => row.id === id)?.version).toBe(2)
  })

  it('the second is told when the first deleted it', async () => {
    const id = await add('well', well('W2'))
    await save([{ op: 'delete', kind: 'well', id, version: 1 }], tom)
    const answer = await save([{ op: 'edit', kind: 'well', id, version: 1, body: well('W2', 3) }])
    expect(answer).toMatchObject({ ok: false, conflicts: [{ id, theirs: null }] })
  })

  it('at the same instant, one of them saves and the other is asked', async () => {
    const id = await add('well', well('W3'))
    const edit = (rate: number): RowChange => ({
      op: 'edit',
      kind: 'well',
      id,
      version: 1,
      body: well('W3', rate),
    })
    const answers = await Promise.all([save([edit(1)], ann), save([edit(2)], tom)])
    expect(answers.map((answer) => answer.ok).sort()).toEqual([false, true])
    const versions = await db('book_rows').where({ project_id: site, id }).orderBy('version').pluck('version')
    expect(versions).toEqual([1, 2])
  })
})

describe('a saved row', () => {
  it('can be seen as it was known on an earlier day, by whom it was recorded', async () => {
    const id = await add('well', well('W4', 100))
    const known = new Date()
    await new Promise((resolve) => setTimeout(resolve, 20))
    await save([{ op: 'edit', kind: 'well', id, version: 1, body: well('W4', 140) }], tom)
    const find = async (at?: Date) => (await listRows(db, site, 'well', at)).find((row) => row.id === id)
    expect(await find(known)).toMatchObject({ version: 1, recordedBy: 'Ann', body: { rate: { value: 100 } } })
    expect(await find()).toMatchObject({ version: 2, recordedBy: 'Tom', body: { rate: { value: 140 } } })
    expect(await find(new Date(0))).toBeUndefined()
  })

  it('keeps the entered unit and leaves its history behind', async () => {
    const body = { ...well('W5'), rate: { value: 3.5, unit: 'l/s' } }
    const id = await add('well', body)
    const [row] = (await listRows(db, site, 'well')).filter((one) => one.id === id)
    expect(row?.body).toMatchObject({ rate: { value: 3.5, unit: 'l/s' }, source: '' })
    const entries = await db('history').where({ project_id: site, subject: 'W5' }).select('action', 'user_id')
    expect(entries).toEqual([{ action: 'added well', user_id: ann }])
  })

  it('is refused cell by cell when its values cannot stand, and the others with it', async () => {
    const ids = [crypto.randomUUID(), crypto.randomUUID()] as const
    const answer = await save([
      { op: 'add', kind: 'well', id: ids[0], body: well('Sound') },
      { op: 'add', kind: 'well', id: ids[1], body: { ...well('Signed'), rate: { value: -5, unit: 'm3/d' } } },
    ])
    expect(answer).toEqual({
      ok: false,
      conflicts: [],
      problems: [{ id: ids[1], field: 'rate', message: 'A rate carries no sign: choose the kind instead.' }],
    })
    expect((await listRows(db, site, 'well')).some((row) => row.id === ids[0])).toBe(false)
  })

  it('reopens its section and those made from it once they were checked', async () => {
    await add('assumption', { reference: 'A1', statement: 'The clay is tight.' })
    const id = await add('material', sand)
    await tick('ground')
    await tick('water')
    await tick('basis')
    await save([{ op: 'edit', kind: 'material', id, version: 1, body: { ...sand, name: 'Silty sand' } }])
    expect((await sectionStatus(db, site, 'ground')).state).toBe('changed since check')
    expect((await sectionStatus(db, site, 'water')).state).toBe('changed since check')
    expect((await sectionStatus(db, site, 'basis')).state).toBe('checked')
  })

  it('is not ticked in another state than the checker saw', async () => {
    const id = await add('material', sand)
    const { digest } = await sectionStatus(db, site, 'ground')
    await save([{ op: 'edit', kind: 'material', id, version: 1, body: { ...sand, name: 'Clayey sand' } }])
    expect(await checkSection(db, site, 'ground', tom, digest)).toBe('changed meanwhile')
    expect((await sectionStatus(db, site, 'ground')).state).not.toBe('checked')
  })
})

async function tick(section: SectionKey) {
  const { digest } = await sectionStatus(db, site, section)
  expect(await checkSection(db, site, section, tom, digest)).toBe('checked')
}

describe('a row that others use', () => {
  it('stays while one of them cannot do without it', async () => {
    const materialId = await add('material', sand)
    await add('zone', { name: 'Site', materialId, base })
    const answer = await save([
      { op: 'delete', kind: 'material', id: materialId, version: 1, alsoElsewhere: true },
    ])
    expect(answer).toMatchObject({ ok: false, problems: [{ id: materialId, field: '' }] })
    expect(answer.ok ? '' : answer.problems[0]?.message).toContain('zone Site')
  })

  it('goes together with the row that uses it', async () => {
    const materialId = await add('material', sand)
    const zoneId = await add('zone', { name: 'Bank', materialId, base })
    const answer = await save([
      { op: 'delete', kind: 'material', id: materialId, version: 1 },
      { op: 'delete', kind: 'zone', id: zoneId, version: 1 },
    ])
    expect(answer.ok).toBe(true)
  })

  it('asks first, then takes the values that cases have for it along', async () => {
    const wellId = await add('well', well('W6'))
    const override = { rowId: wellId, quantity: 'rate', value: { value: 9, unit: 'm3/d' } }
    const caseId = await add('case', { name: 'C2', overrides: [override] })
    expect((await listUses(db, site, rowKinds))[wellId]).toEqual([{ words: 'case C2', holds: false }])
    const remove: RowChange = { op: 'delete', kind: 'well', id: wellId, version: 1 }
    expect(await save([remove])).toMatchObject({ ok: false, problems: [{ id: wellId }] })
    expect(await save([{ ...remove, alsoElsewhere: true }])).toMatchObject({ ok: true })
    const [left] = await listRows(db, site, 'case')
    expect(left).toMatchObject({ id: caseId, version: 2, body: { name: 'C2', overrides: [] } })
  })

  it('must be in the same project', async () => {
    const foreign = await add('material', sand, otherSite)
    const id = crypto.randomUUID()
    const answer = await save([
      { op: 'add', kind: 'zone', id, body: { name: 'Site', materialId: foreign, base } },
    ])
    expect(answer).toMatchObject({ ok: false, problems: [{ id, field: 'materialId' }] })
  })
})

describe('a row of another project', () => {
  it('cannot be changed by its id', async () => {
    const id = await add('well', well('W7'), otherSite)
    const answer = await save([{ op: 'edit', kind: 'well', id, version: 1, body: well('W7', 1) }])
    expect(answer).toMatchObject({ ok: false, conflicts: [{ id, theirs: null }] })
    const [row] = (await listRows(db, otherSite, 'well')).filter((one) => one.id === id)
    expect(row?.version).toBe(1)
  })
})
