import { createHash } from 'node:crypto'
import type { Knex } from 'knex'
import { putBuffer } from '../../app/files/files.server.ts'
import { type Role, roles } from '../../app/projects/permissions.ts'
import type { ImportReceipt } from '../../app/readings/import-settings.ts'
import { encodeHeads } from '../../app/solver/heads-buffer.ts'
import type { Model } from '../../app/solver/model.ts'
import { solveModel } from '../../app/solver/solve.ts'
import { makePerson, makeProject } from '../people.ts'

/** Whoever may knock: the six roles of a project, and three who are not in it. */
export const visitors = [...roles, 'outsider', 'administrator', 'signed out'] as const
export type Visitor = (typeof visitors)[number]

/** Ids that stand in the URLs of one project. */
export type Params = Record<
  'projectId' | 'runId' | 'importId' | 'instrumentId' | 'fileId' | 'packageId',
  string
>

export interface World {
  people: Record<Exclude<Visitor, 'signed out'>, number>
  /** The project whose members the six roles are. */
  own: Params
  /** A project of other people, with children of every kind. */
  foreign: Params
  /** A revision of the own project that is not issued. */
  draftPackageId: string
  /** A solve of the API that the originator started. */
  jobId: string
}

/** One project with a member in each role and another one of somebody else, each with a child of every kind. */
export async function makeWorld(database: Knex): Promise<World> {
  const people = {} as World['people']
  for (const role of roles) people[role] = await makePerson(database, { name: `The ${role}` })
  people.outsider = await makePerson(database, { name: 'The outsider' })
  people.administrator = await makePerson(database, { name: 'The administrator', isAdministrator: true })
  const ownProject = await makeProject(database, {
    number: 'OWN-1',
    createdBy: people['project manager'],
    members: roles.map((role): [number, Role] => [people[role], role]),
  })
  const foreignProject = await makeProject(database, {
    number: 'FOREIGN-1',
    createdBy: people.outsider,
    members: [[people.outsider, 'project manager']],
  })
  const own = await makeChildren(database, ownProject, people.originator)
  const jobId = await insert(database, 'jobs', {
    user_id: people.originator,
    kind: 'solve',
    state: 'cancelled',
    created_at: new Date(),
  })
  return {
    people,
    own,
    foreign: await makeChildren(database, foreignProject, people.outsider),
    draftPackageId: await makePackage(database, ownProject, people.originator, 'P02', 'draft'),
    jobId: String(jobId),
  }
}

async function insert(database: Knex, table: string, row: Record<string, unknown>): Promise<number> {
  const [id] = await database(table).insert(row)
  if (id === undefined) throw new Error(`The database returned no id for ${table}.`)
  return id
}

async function makeFile(database: Knex, projectId: number, userId: number, kind: string): Promise<number> {
  const stored = await putBuffer(Buffer.from(`a ${kind} of project ${projectId}`), {
    folder: `projects/${projectId}`,
    contentType: 'text/plain',
  })
  return insert(database, 'files', {
    project_id: projectId,
    kind,
    name: `${kind}.txt`,
    content_type: 'text/plain',
    bytes: stored.bytes,
    sha256: stored.sha256,
    s3_key: stored.key,
    stored_at: new Date(),
    stored_by: userId,
  })
}

async function makePackage(
  database: Knex,
  projectId: number,
  userId: number,
  revision: string,
  status: 'draft' | 'issued',
): Promise<string> {
  const id = await insert(database, 'packages', {
    project_id: projectId,
    revision,
    status,
    purpose: 'for construction',
    reason: 'first issue',
    file_id: await makeFile(database, projectId, userId, 'package'),
    created_at: new Date(),
    created_by: userId,
    issued_at: status === 'issued' ? new Date() : null,
    issued_by: status === 'issued' ? userId : null,
  })
  return String(id)
}

/** A strip of sand between two fixed heads, with a well in the middle. */
const model: Model = {
  format: 'lavant-model',
  version: 1,
  title: 'Strip',
  units: { length: 'm', time: 'd' },
  kind: 'plan',
  flow: 'confined',
  time: { kind: 'steady' },
  extent: { x: [0, 100], y: [0, 50] },
  grid: { columns: 10, rows: 5 },
  materials: [{ name: 'Sand', kx: 10, ky: 10 }],
  ground: [{ material: 'Sand', base: 0, top: 10 }],
  wells: [{ name: 'W1', x: 55, y: 25, kind: 'abstraction', rate: 50 }],
  boundaries: [
    {
      name: 'West',
      kind: 'fixed head',
      line: [
        [0, 0],
        [0, 50],
      ],
      head: 20,
    },
    {
      name: 'East',
      kind: 'fixed head',
      line: [
        [100, 0],
        [100, 50],
      ],
      head: 18,
    },
  ],
}

async function makeRun(database: Knex, projectId: number, userId: number): Promise<number> {
  const input = JSON.stringify(model)
  const { result, grid, heads } = solveModel(model)
  const stored = await putBuffer(new Uint8Array(encodeHeads(grid, heads)), {
    folder: `projects/${projectId}/runs`,
    contentType: 'application/octet-stream',
  })
  const now = new Date()
  return insert(database, 'runs', {
    project_id: projectId,
    number: 1,
    case_id: 'base',
    case_version: 1,
    case_name: 'Base case',
    state: 'done',
    input,
    input_sha256: createHash('sha256').update(input).digest('hex'),
    sections_digest: '0'.repeat(64),
    engine: result.engine,
    converged: result.converged,
    result: JSON.stringify(result),
    heads_key: stored.key,
    heads_sha256: stored.sha256,
    heads_format: 1,
    created_at: now,
    ended_at: now,
    created_by: userId,
  })
}

async function makeImport(database: Knex, projectId: number, userId: number): Promise<number> {
  const fileId = await makeFile(database, projectId, userId, 'readings')
  const [file] = await database('files').where({ id: fileId }).select('name', 'bytes', 'sha256')
  const now = new Date()
  const receipt: ImportReceipt = {
    file: { name: file.name, bytes: file.bytes, sha256: file.sha256 },
    counts: { rows: 0, accepted: 0, identical: 0, conflicts: 0, refused: 0 },
    superseded: 0,
    conflictRule: 'keep',
    reason: null,
    instruments: [],
    addedInstruments: [],
    reasons: [],
    committedAt: now.toISOString(),
    committedBy: 'somebody',
  }
  return insert(database, 'imports', {
    project_id: projectId,
    file_id: fileId,
    state: 'committed',
    receipt: JSON.stringify(receipt),
    created_at: now,
    created_by: userId,
    committed_at: now,
    committed_by: userId,
  })
}

async function makeChildren(database: Knex, projectId: number, userId: number): Promise<Params> {
  const now = new Date()
  const runId = await makeRun(database, projectId, userId)
  const importId = await makeImport(database, projectId, userId)
  const instrumentId = `instrument-${projectId}`
  await database('book_rows').insert({
    project_id: projectId,
    id: instrumentId,
    version: 1,
    section: 'readings',
    kind: 'instrument',
    position: 1,
    body: JSON.stringify({
      name: `SP${projectId}`,
      kind: 'standpipe',
      x: 500000,
      y: 180000,
      groundLevel: null,
      responseTop: null,
      responseBase: null,
      serial: '',
      installedOn: null,
      pointId: null,
      outOfService: false,
      source: '',
    }),
    recorded_from: now,
    recorded_by: userId,
  })
  return {
    projectId: String(projectId),
    runId: String(runId),
    importId: String(importId),
    instrumentId,
    fileId: String(await makeFile(database, projectId, userId, 'site plan')),
    packageId: await makePackage(database, projectId, userId, 'P01', 'issued'),
  }
}
