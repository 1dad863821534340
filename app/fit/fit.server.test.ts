import { randomUUID } from 'node:crypto'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { sectionStatus } from '~/book/sections.server'
import { toCsv, toTsv } from '~/components/spreadsheet'
import type { Run } from '~/heads/runs.server'
import type { Project } from '~/projects/project'
import { type FreshDatabase, freshDatabase } from '../../test/database'
import { makePerson } from '../../test/people'
import { makeStrip, stripInstrument, takeDip } from '../../test/strip'
import { spanFrom } from './fit'
import { dayOfLastReading, fitOf, keptComparison, recordFit } from './fit.server'
import { fitTable } from './fit-table'

let fresh: FreshDatabase
let project: Project
let run: Run
let userId = 0
const ids = { a: randomUUID(), b: randomUUID(), c: randomUUID() }

const dip = (instrumentId: string, at: string, value: number | null, status?: string) =>
  takeDip(fresh.database, { projectId: project.id, instrumentId, at, dip: value, status })

beforeAll(async () => {
  fresh = await freshDatabase()
  userId = await makePerson(fresh.database, { name: 'O. Birch' })
  const strip = await makeStrip(fresh.database, { number: 'P-1', originator: userId })
  project = strip.project
  // A stands at the named point, B has none, C lies outside.
  await strip.save([
    ...stripInstrument('A', 500, ids.a, { pointId: strip.ids.point }),
    ...stripInstrument('B', 225, ids.b),
    ...stripInstrument('C', 5000, ids.c),
  ])
  run = await strip.compute()
  await dip(ids.a, '2026-03-10T10:00:00Z', 3.8)
  await dip(ids.a, '2026-03-12T10:00:00Z', 3.9)
  await dip(ids.b, '2026-03-11T10:00:00Z', 3.5)
  await dip(ids.c, '2026-03-11T10:00:00Z', 3)
}, 120_000)
afterAll(() => fresh.close())

describe('A fit', () => {
  it('holds the nearest reading of a day against the head at the named point, or in the field without one', async () => {
    const fit = await fitOf(fresh.database, project, run, { date: '2026-03-12' })
    // Between 12 m and 10 m over 1000 m the head falls evenly: 11 m at x = 500 and 11.55 m at x = 225.
    expect(fit.lines).toMatchObject([
      { name: 'A', n: 1, measured: expect.closeTo(11.1, 9), modelled: expect.closeTo(11, 6) },
      { name: 'B', measured: expect.closeTo(11.5, 9), modelled: expect.closeTo(11.55, 6) },
      { name: 'C', modelled: null, residual: null, why: 'outside the model, or dry in it' },
    ])
    expect(fit.lines[0]?.residual).toBeCloseTo(0.1, 6)
    expect(fit.lines[1]?.residual).toBeCloseTo(-0.05, 6)
    expect(fit.statistics).toMatchObject({
      n: 2,
      bias: expect.closeTo(0.025, 6),
      mae: expect.closeTo(0.075, 6),
      rmse: expect.closeTo(Math.sqrt(0.0125 / 2), 6),
      largest: expect.closeTo(0.1, 6),
    })
  })

  it('takes the mean of a window whose days begin at midnight of the site', async () => {
    const fit = await fitOf(fresh.database, project, run, { from: '2026-03-10', to: '2026-03-12' })
    expect(fit.lines[0]).toMatchObject({
      n: 2,
      measured: expect.closeTo(11.15, 9),
      firstAt: '2026-03-10T10:00:00.000Z',
      lastAt: '2026-03-12T10:00:00.000Z',
    })
    const shorter = await fitOf(fresh.database, project, run, { from: '2026-03-11', to: '2026-03-11' })
    expect(shorter.lines[0]).toMatchObject({ measured: null, residual: null, why: 'no reading' })
  })

  it('compares nothing with a reading of another season', async () => {
    const fit = await fitOf(fresh.database, project, run, { date: '2026-08-01' })
    expect(fit.statistics).toBeNull()
    expect(fit.lines.every((line) => line.measured === null)).toBe(true)
  })

  it('begins with the day of the last head, not of a dry reading after it', async () => {
    expect(await dayOfLastReading(fresh.database, project)).toBe('2026-03-12')
    await dip(ids.a, '2026-03-20T10:00:00Z', null, 'dry')
    expect(await dayOfLastReading(fresh.database, project)).toBe('2026-03-12')
  })

  it('gives its statistics in the feet of a project in feet', async () => {
    const inFeet: Project = { ...project, units: { length: 'ft', time: 'd' } }
    const { statistics } = await fitOf(fresh.database, inFeet, run, { date: '2026-03-12' })
    expect(statistics?.bias).toBeCloseTo(0.025 / 0.3048, 5)
  })

  it('stands for section 7 once it is kept, and gives way to the next', async () => {
    expect(await recordFit(fresh.database, project, run, { date: '2026-03-12' }, userId)).toBe(true)
    expect((await sectionStatus(fresh.database, project.id, 'fit')).state).toBe('drafted')
    const span = { from: '2026-03-10', to: '2026-03-12' }
    expect(await recordFit(fresh.database, project, run, span, userId)).toBe(true)
    const kept = await keptComparison(fresh.database, project.id)
    expect(kept).toMatchObject({ version: 2, body: { runId: run.id, span, statistics: { n: 2 } } })
  })
})

describe('The span of a comparison in an address', () => {
  const of = (text: string) => spanFrom(new URLSearchParams(text))

  it('is a day or a window', () => {
    expect(of('date=2026-03-12')).toEqual({ span: { date: '2026-03-12' }, problem: null })
    expect(of('from=2026-03-01&to=2026-03-12').span).toEqual({ from: '2026-03-01', to: '2026-03-12' })
    expect(of('')).toEqual({ span: null, problem: null })
  })

  it('is refused in words when it is neither', () => {
    expect(of('date=2026-02-31x').problem).toContain('is not a date')
    expect(of('date=2026-13-01').problem).toContain('is not a date')
    expect(of('date=2026-02-30').problem).toContain('is not a date')
    expect(of('from=2026-03-01').problem).toBe('A window needs its first and its last day.')
    expect(of('from=2026-03-02&to=2026-03-01').problem).toBe('The window ends before it begins.')
  })
})

describe('The fit sheet that leaves Lavant', () => {
  const names = ['=1+1', '+1', '-1', '@SUM(A1)', '\tx', 'a "quoted", name']
  const lines = names.map((name, index) => ({
    instrumentId: String(index),
    name,
    x: 1,
    y: 2,
    measured: -1.5,
    firstAt: null,
    lastAt: null,
    n: 1,
    modelled: -1.25,
    residual: -0.25,
    why: null,
  }))

  it('holds no text that a spreadsheet would run, and its negative numbers stay numbers', () => {
    const [head, ...rows] = toCsv(fitTable(lines, 'm')).replace('\ufeff', '').trimEnd().split('\r\n')
    expect(head).toContain('Residual = measured - modelled (m)')
    expect(rows.map((row) => row.split(',1,2,')[0])).toEqual([
      "'=1+1",
      "'+1",
      "'-1",
      "'@SUM(A1)",
      "'\tx",
      '"a ""quoted"", name"',
    ])
    for (const row of rows) expect(row).toContain(',-1.5,-1.25,-0.25,1,')
    expect(toTsv(fitTable(lines.slice(0, 1), 'm')).split('\n')[1]).toMatch(/^'=1\+1\t1\t2\t-1\.5/)
  })
})
