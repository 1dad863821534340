import { randomUUID } from 'node:crypto'
import { read, utils } from '@e965/xlsx'
import { RouterContextProvider } from 'react-router'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { membershipContext } from '~/projects/guard.server'
import type { Role } from '~/projects/permissions'
import type { Project } from '~/projects/project'
import { type FreshDatabase, freshDatabase } from '../../../test/database'
import { makePerson } from '../../../test/people'
import { makeStrip, stripInstrument, takeDip } from '../../../test/strip'
import { loader } from './fit-download'

let fresh: FreshDatabase
let project: Project
let runId = 0
let userId = 0

beforeAll(async () => {
  fresh = await freshDatabase()
  userId = await makePerson(fresh.database, { name: 'O. Birch' })
  const strip = await makeStrip(fresh.database, { number: 'P-1', originator: userId })
  project = strip.project
  const instrumentId = randomUUID()
  await strip.save(stripInstrument('=A1', 500, instrumentId, { pointId: strip.ids.point }))
  runId = (await strip.compute()).id
  const at = '2026-03-12T10:00:00Z'
  await takeDip(fresh.database, { projectId: project.id, instrumentId, at, dip: 3.9 })
}, 120_000)
afterAll(() => fresh.close())

/** The download as somebody with a role gets it. */
async function download(query: string, role: Role = 'originator'): Promise<Response> {
  const context = new RouterContextProvider()
  context.set(membershipContext, {
    project,
    member: { userId, name: 'O. Birch', role },
    user: { userId, name: 'O. Birch' } as never,
  })
  const request = new Request(`http://lavant.test/projects/1/fit/download?${query}`)
  return loader({ context, request, params: {} } as never)
}

describe('The download of the fit sheet', () => {
  it('is CSV under the name of its run and day, with no cell that a spreadsheet would run', async () => {
    const response = await download(`run=${runId}&date=2026-03-12&format=csv`)
    expect(response.headers.get('content-disposition')).toMatch(/attachment.*fit run 1 2026-03-12\.csv/)
    const [, row = ''] = (await response.text()).split('\r\n')
    const [name, x, y, measured, modelled, residual, n] = row.split(',')
    expect([name, x, y, n]).toEqual(["'=A1", '500', '300', '1'])
    expect(Number(measured)).toBeCloseTo(11.1, 9)
    expect(Number(modelled)).toBeCloseTo(11, 6)
    expect(Number(residual)).toBeCloseTo(0.1, 6)
  })

  it('is a workbook that reads back with its numbers as numbers and its text as text', async () => {
    const response = await download(`run=${runId}&from=2026-03-11&to=2026-03-13&format=xlsx`)
    const workbook = read(new Uint8Array(await response.arrayBuffer()))
    const sheet = workbook.Sheets.Fit
    expect(sheet?.A2).toMatchObject({ t: 's', v: "'=A1" })
    expect(sheet?.A2?.f).toBeUndefined()
    const rows = utils.sheet_to_json<(string | number)[]>(sheet as never, { header: 1 })
    expect(rows[1]?.[3]).toBeCloseTo(11.1, 9)
    expect(rows[1]?.[5]).toBeCloseTo(0.1, 6)
  })

  it('is not there for a client, for a run that is not, or without its day', async () => {
    await expect(download(`run=${runId}&date=2026-03-12`, 'client')).rejects.toMatchObject({ status: 404 })
    await expect(download(`run=${runId + 1}&date=2026-03-12`)).rejects.toMatchObject({ status: 404 })
    await expect(download(`run=${runId}`)).rejects.toMatchObject({ status: 400 })
  })
})
