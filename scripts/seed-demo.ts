import { randomUUID } from 'node:crypto'
import { readFile } from 'node:fs/promises'
import { Readable } from 'node:stream'
import type { Knex } from 'knex'
import { basisKinds } from '../app/basis/basis-kinds.server'
import { coverRowId } from '../app/book/cover'
import { coverKinds } from '../app/book/cover-kinds.server'
import type { RowChange } from '../app/book/row'
import { listRows, type RowKind, saveRows } from '../app/book/rows.server'
import { checkSection, sectionStatus } from '../app/book/sections.server'
import { casesKinds } from '../app/cases/cases-kinds.server'
import { checkKinds } from '../app/checks/check-kinds.server'
import { putObject, recordFile } from '../app/files/files.server'
import { recordFit } from '../app/fit/fit.server'
import { groundKinds } from '../app/ground/ground-kinds.server'
import { findRun, type Run, runPoints, startRun } from '../app/heads/runs.server'
import { findJob, jobEnded } from '../app/jobs/jobs.server'
import { findPackage, issuePackage, makePackage, signPackage } from '../app/packages/packages.server'
import type { Project } from '../app/projects/project'
import { createProject, findProject, updateProgress } from '../app/projects/projects.server'
import type { ImportSettings } from '../app/readings/import-settings'
import { importFile } from '../app/readings/imports.server'
import { readingKinds } from '../app/readings/reading-kinds.server'
import { waterKinds } from '../app/water/water-kinds.server'
import {
  demoAssumptions,
  demoBasis,
  demoBoundaries,
  demoCover,
  demoEstimates,
  demoExtent,
  demoInstruments,
  demoMaterials,
  demoProgress,
  demoProject,
  demoRecharge,
  demoStandards,
  demoWalls,
  demoWells,
  demoZones,
} from '../database/seeds/demo-book'
import { type DemoHead, demoReadingFiles, readingsTo } from '../database/seeds/demo-readings'
import { demoPeople } from '../database/seeds/people'
import { atGrid, planPicture, planPixel, surveyStations } from '../database/seeds/site-plan'

const kinds: Record<string, RowKind> = {
  ...coverKinds,
  ...basisKinds,
  ...groundKinds,
  ...waterKinds,
  ...casesKinds,
  ...readingKinds,
  ...checkKinds,
}

/**
 * Fills an empty database with the demo: one project through the same functions that the pages call, so that the demo
 * cannot drift from the application. Dates are then moved back to when such work would have been done.
 * Throws when a step is refused.
 */
export async function seedDemo(db: Knex): Promise<void> {
  const people = await addPeople(db)
  const { originator, data, manager, checker, approver } = people
  const projectId = await createProject(db, demoProject, manager)
  const project = await findProject(db, projectId)
  if (!project) throw new Error('The demo project was not created.')
  await addMembers(db, projectId, people)
  await updateProgress(db, projectId, demoProgress, manager)

  const book = await writeBook(db, project, originator)
  const before = await runToEnd(db, project, book.beforeCase, originator)
  const during = await runToEnd(db, project, book.baseCase, originator)
  await moveBack(db, '2026-11-23T10:20:00Z')
  await importReadings(db, project, data, book, { before, during })
  await moveBack(db, '2026-11-24T08:40:00Z')
  // A receipt carries its own date, for whoever downloads it.
  await db('imports').update({
    receipt: db.raw(
      "json_set(receipt, '$.committedAt', date_format(committed_at, '%Y-%m-%dT%H:%i:%s.000Z'))",
    ),
  })

  await saveEstimates(db, project, originator, during)
  await recordFit(db, project, during, { date: '2026-11-23' }, originator)
  const first = await open(
    makePackage(
      db,
      project,
      {
        runId: during.id,
        againstRunId: before.id,
        fitDate: '2026-11-23',
        purpose: demoCover.purposeOfIssue,
        reason: 'First issue',
      },
      originator,
    ),
  )
  await drawn(db, projectId, first)
  await checkAll(db, projectId, checker)
  await moveBack(db, '2026-11-24T15:05:00Z')
  for (const [role, person, at] of [
    ['originator', originator, '2026-11-24T15:40:00Z'],
    ['checker', checker, '2026-11-25T10:12:00Z'],
    ['approver', approver, '2026-11-25T16:31:00Z'],
  ] as const) {
    const seen = await findPackage(db, projectId, first)
    await open(signPackage(db, project, first, role, person, seen?.input_sha256 ?? ''))
    await drawn(db, projectId, first)
    await moveBack(db, at)
  }
  await open(issuePackage(db, project, first, manager, new Date('2026-11-26T09:15:00Z')))
  await drawn(db, projectId, first)
  await moveBack(db, '2026-11-26T09:15:00Z')

  await raiseBasinB(db, project, originator)
  await moveBack(db, '2026-11-27T11:30:00Z')
  const latest = await runToEnd(db, project, book.baseCase, originator)
  await recordFit(db, project, latest, { date: '2026-11-27' }, originator)
  const second = await open(
    makePackage(
      db,
      project,
      {
        runId: latest.id,
        againstRunId: before.id,
        fitDate: '2026-11-27',
        purpose: demoCover.purposeOfIssue,
        reason: 'Recharge of Basin B raised to the inflow measured in November',
      },
      originator,
    ),
  )
  await drawn(db, projectId, second)
  await moveBack(db, '2026-11-30T14:20:00Z')
}

interface People {
  originator: number
  data: number
  manager: number
  checker: number
  approver: number
  client: number
}

async function addPeople(db: Knex): Promise<People> {
  const ids = new Map<string, number>()
  for (const person of demoPeople) {
    const [id] = await db('users').insert({
      email: person.email,
      name: person.name,
      is_administrator: person.role === 'administrator',
      created_at: new Date('2025-11-10T09:00:00Z'),
    })
    if (id === undefined) throw new Error('The database returned no user id.')
    ids.set(person.role, id)
  }
  const of = (role: string) => {
    const id = ids.get(role)
    if (id === undefined) throw new Error(`The demo has nobody as ${role}.`)
    return id
  }
  return {
    originator: of('originator'),
    data: of('data'),
    manager: of('project manager'),
    checker: of('checker'),
    approver: of('approver'),
    client: of('client'),
  }
}

async function addMembers(db: Knex, projectId: number, people: People): Promise<void> {
  const roles = ['originator', 'data', 'checker', 'approver', 'client'] as const
  await db('members').insert(
    roles.map((role) => ({
      project_id: projectId,
      user_id: people[role],
      role,
      from_at: new Date('2025-11-10T09:30:00Z'),
      invited_by: people.manager,
    })),
  )
}

interface Book {
  baseCase: string
  beforeCase: string
  /** Ids of named points and instruments by name. */
  points: Map<string, string>
}

async function save(
  db: Knex,
  project: Project,
  userId: number,
  changes: RowChange[],
  reason?: string,
): Promise<void> {
  const answer = await saveRows(db, { projectId: project.id, userId, changes, kinds, reason })
  if (!answer.ok) throw new Error(`The demo's rows were refused: ${JSON.stringify(answer)}`)
}

function added(kind: string, bodies: readonly unknown[]): (RowChange & { op: 'add' })[] {
  return bodies.map((body) => ({ op: 'add', kind, id: randomUUID(), body }))
}

async function writeBook(db: Knex, project: Project, userId: number): Promise<Book> {
  const materials = added(
    'material',
    demoMaterials.map(({ key: _, ...body }) => body),
  )
  const materialId = new Map(demoMaterials.map(({ key }, i) => [key, materials[i]?.id]))
  const zones = added(
    'zone',
    demoZones.map(({ material, ...body }) => ({ ...body, materialId: materialId.get(material) })),
  )
  const points = added(
    'point',
    demoInstruments.map(({ name, x, y, source }) => ({ name, x, y, source })),
  )
  const wells = added('well', demoWells)
  const base: RowChange = {
    op: 'add',
    kind: 'case',
    id: randomUUID(),
    body: {
      name: 'Eight wells, wall to the clay',
      isBase: true,
      note: 'The scheme as designed: all wells at the rates of section 3.',
      flow: 'unconfined',
      extent: demoExtent,
      cellSize: { value: 5, unit: 'm' },
    },
  }
  const before: RowChange = {
    op: 'add',
    kind: 'case',
    id: randomUUID(),
    body: {
      name: 'Before pumping',
      note: 'Same ground and water, wells at rest: what drawdown is taken from.',
      overrides: wells.map(({ id }) => ({ rowId: id, quantity: 'rate', value: { value: 0, unit: 'm3/d' } })),
    },
  }
  await save(db, project, userId, [
    { op: 'add', kind: 'cover', id: coverRowId, body: demoCover },
    { op: 'add', kind: 'basis', id: 'basis', body: demoBasis },
    ...added('assumption', demoAssumptions),
    ...added('standard', demoStandards),
    ...materials,
    ...zones,
    ...points,
    { op: 'add', kind: 'plan image', id: 'plan-image', body: await planImage(db, project.id, userId) },
    ...wells,
    ...added('recharge zone', demoRecharge),
    ...added('boundary', demoBoundaries),
    ...added('wall', demoWalls),
    base,
    before,
  ])
  return {
    baseCase: base.id,
    beforeCase: before.id,
    points: new Map(demoInstruments.map(({ name }, i) => [name, points[i]?.id ?? ''])),
  }
}

async function planImage(db: Knex, projectId: number, userId: number): Promise<unknown> {
  const picture = await readFile(new URL(`../database/seeds/${planPicture.file}`, import.meta.url))
  const stored = await putObject(Readable.from([picture]), {
    folder: `projects/${projectId}/files`,
    contentType: 'image/png',
    limit: 20 * 1024 * 1024,
  })
  const fileId = await recordFile(db, {
    projectId,
    kind: 'plan image',
    name: 'Site plan TQ-SP-001.png',
    contentType: 'image/png',
    stored,
    userId,
  })
  const control = [surveyStations.ST1, surveyStations.ST2].map((station) => {
    const [x, y] = atGrid(station)
    return { ...planPixel(station), x, y }
  })
  return { fileId, width: planPicture.width, height: planPicture.height, control, opacity: 0.6 }
}

async function runToEnd(db: Knex, project: Project, caseId: string, userId: number): Promise<Run> {
  const answer = await startRun(db, project, caseId, userId)
  if (!answer.ok) throw new Error(`The demo's case cannot run: ${JSON.stringify(answer)}`)
  await jobEnded(answer.jobId)
  const run = await findRun(db, project.id, answer.runId)
  if (run?.state !== 'done' || !run.converged)
    throw new Error(`The demo's run did not converge: ${run?.error ?? run?.state}`)
  return run
}

async function importReadings(
  db: Knex,
  project: Project,
  userId: number,
  book: Book,
  runs: { before: Run; during: Run },
): Promise<void> {
  const instruments = added(
    'instrument',
    demoInstruments.map(({ levels: _, ...body }) => ({ ...body, pointId: book.points.get(body.name) })),
  )
  const idOf = new Map(demoInstruments.map(({ name }, i) => [name, instruments[i]?.id ?? '']))
  await save(db, project, userId, [
    ...instruments,
    ...added(
      'reference level',
      demoInstruments.flatMap(({ name, levels }) =>
        levels.map(({ level, ...rest }) => ({
          ...rest,
          instrumentId: idOf.get(name),
          level: { value: level, unit: 'm' },
          levelled: 'pipe top',
        })),
      ),
    ),
  ])
  for (const file of demoReadingFiles(await demoHeads(db, project.id, runs))) {
    await importFile(db, {
      project,
      userId,
      name: file.name,
      content: file.text,
      settings: file.instrument ? loggerSettings(idOf.get(file.instrument) ?? '') : dipSettings(idOf),
      now: new Date(readingsTo),
    })
  }
}

const loggerSettings = (instrumentId: string): ImportSettings => ({
  encoding: 'utf-8',
  delimiter: ',',
  headerRow: 5,
  header: ['Date and time', 'Water level (m)', 'Temperature (C)'],
  instruments: { by: 'one', instrumentId },
  times: { by: 'columns', date: 0, time: null, order: 'day first', timeIfNone: null },
  zone: { rule: 'utc' },
  value: { column: 1, quantity: 'level', unit: 'm', decimalMark: 'point', status: null },
})

const dipSettings = (idOf: Map<string, string>): ImportSettings => ({
  encoding: 'utf-8',
  delimiter: ';',
  headerRow: 1,
  header: ['Piezometer', 'Date', 'Time', 'Dip (m)'],
  instruments: { by: 'column', column: 0, names: Object.fromEntries(idOf), places: null },
  times: { by: 'columns', date: 1, time: 2, order: 'day first', timeIfNone: null },
  zone: { rule: 'utc' },
  value: { column: 3, quantity: 'dip', unit: 'm', decimalMark: 'point', status: null },
})

/** What the model misses at each piezometer, metres, and how much of the river's tide it feels. */
const believable: Record<string, [offset: number, tide: number]> = {
  P1: [0.06, 0],
  P2: [-0.09, 0],
  P3: [0.05, 0.06],
  P4: [-0.04, 0.14],
  P5: [0.12, 0.03],
  P6: [-0.07, 0.02],
  P7: [0.08, 0.04],
  P8: [-0.05, 0],
  P9: [0.03, 0],
  P10: [0.02, 0.42],
}

async function demoHeads(
  db: Knex,
  projectId: number,
  runs: { before: Run; during: Run },
): Promise<DemoHead[]> {
  const heads = async (run: Run) =>
    new Map((await runPoints(db, projectId, run.id)).map((p) => [p.name, p.head]))
  const before = await heads(runs.before)
  const during = await heads(runs.during)
  return demoInstruments.map(({ name, kind, levels }) => {
    const [offset, tide] = believable[name] ?? [0, 0]
    return {
      name,
      kind,
      pipeTop: levels,
      before: before.get(name) ?? 0,
      during: during.get(name) ?? 0,
      offset,
      tide,
    }
  })
}

async function saveEstimates(db: Knex, project: Project, userId: number, run: Run): Promise<void> {
  const pumped = run.result?.wells.reduce((sum, well) => sum + (well.achieved[0] ?? 0), 0) ?? null
  await save(
    db,
    project,
    userId,
    added(
      'estimate',
      demoEstimates.map((estimate) => ({ ...estimate, computed: pumped })),
    ),
  )
}

async function raiseBasinB(db: Knex, project: Project, userId: number): Promise<void> {
  const rows = await listRows<{ name: string }>(db, project.id, 'recharge zone')
  const basin = rows.find((row) => row.body.name === 'Basin B')
  if (!basin) throw new Error('The demo has no Basin B.')
  const body = {
    ...basin.body,
    rate: { value: 12, unit: 'mm/d' },
    source: 'Inflow meter at Basin B, November 2026, over the area',
  }
  await save(db, project, userId, [
    { op: 'edit', kind: 'recharge zone', id: basin.id, version: basin.version, body },
  ])
}

async function open(
  outcome: Promise<{ ok: true; packageId: number } | { ok: false; message: string }>,
): Promise<number> {
  const answer = await outcome
  if (!answer.ok) throw new Error(`The demo's package was refused: ${answer.message}`)
  return answer.packageId
}

async function drawn(db: Knex, projectId: number, packageId: number): Promise<void> {
  const row = await findPackage(db, projectId, packageId)
  if (row?.job_id === null || row?.job_id === undefined) throw new Error('The package is not being drawn.')
  await jobEnded(row.job_id)
  const job = await findJob(row.job_id)
  if (job?.state !== 'done') throw new Error(`The package could not be drawn: ${job?.error ?? job?.state}`)
}

async function checkAll(db: Knex, projectId: number, userId: number): Promise<void> {
  for (const section of [
    'cover',
    'basis',
    'ground',
    'water',
    'cases',
    'heads',
    'readings',
    'fit',
    'checks',
  ] as const) {
    const { digest } = await sectionStatus(db, projectId, section)
    if ((await checkSection(db, projectId, section, userId, digest)) !== 'checked')
      throw new Error(`Section ${section} of the demo is empty.`)
  }
}

/** Tables and the columns that say when something was done. */
const dated: Record<string, string[]> = {
  projects: ['created_at'],
  members: ['from_at'],
  history: ['at'],
  book_rows: ['recorded_from', 'recorded_to'],
  book_sections: ['changed_at', 'checked_at'],
  files: ['stored_at'],
  jobs: ['created_at', 'started_at', 'ended_at'],
  runs: ['created_at', 'started_at', 'ended_at'],
  imports: ['created_at', 'committed_at'],
  packages: ['created_at'],
  package_signatures: ['signed_at'],
  warning_acceptances: ['accepted_at'],
}

let phaseBegan = new Date()

/** Moves what was recorded since the last call back to `to`, durations and order kept. */
async function moveBack(db: Knex, to: string): Promise<void> {
  const seconds = Math.round((phaseBegan.getTime() - Date.parse(to)) / 1000)
  for (const [table, columns] of Object.entries(dated)) {
    for (const column of columns) {
      await db(table)
        .where(column, '>=', phaseBegan)
        .update({ [column]: db.raw('?? - interval ? second', [column, seconds]) })
    }
  }
  phaseBegan = new Date()
}
