import { randomUUID } from 'node:crypto'
import type { Knex } from 'knex'
import type { RowChange } from '../app/book/row.ts'
import { saveRows } from '../app/book/rows.server.ts'
import { findRun, type Run, startRun } from '../app/heads/runs.server.ts'
import { jobEnded } from '../app/jobs/jobs.server.ts'
import type { Role } from '../app/projects/permissions.ts'
import type { Project } from '../app/projects/project.ts'
import { findProject } from '../app/projects/projects.server.ts'
import { rowKinds } from '../app/row-kinds.server.ts'
import { makeProject } from './people.ts'

const m = (value: number) => ({ value, unit: 'm' })

export function add(kind: string, body: object, id: string = randomUUID()): RowChange {
  return { op: 'add', kind, id, body }
}

/**
 * A project whose answer is known: a confined strip of 1000 m by 600 m between 12 m in the west and 10 m in the east,
 * in which heads fall evenly (h = 12 - 2 x / 1000) while its well W1 stands still. P1 lies at x = 500.
 */
export interface Strip {
  project: Project
  ids: { base: string; well: string; point: string }
  save: (changes: RowChange[]) => Promise<void>
  /** Computes the case as the book stands. */
  compute: () => Promise<Run>
}

export async function makeStrip(
  database: Knex,
  options: { number: string; originator: number; members?: readonly [number, Role][] },
): Promise<Strip> {
  const { originator, ...rest } = options
  const projectId = await makeProject(database, { ...rest, createdBy: originator })
  const project = await findProject(database, projectId)
  if (!project) throw new Error('The project was just made.')
  const ids = { base: randomUUID(), well: randomUUID(), point: randomUUID() }
  async function save(changes: RowChange[]) {
    const answer = await saveRows(database, { projectId, userId: originator, changes, kinds: rowKinds })
    if (!answer.ok) throw new Error(JSON.stringify(answer))
  }
  async function compute() {
    const answer = await startRun(database, project as Project, ids.base, originator)
    if (!answer.ok) throw new Error(JSON.stringify(answer))
    await jobEnded(answer.jobId)
    const run = await findRun(database, projectId, answer.runId)
    if (run?.state !== 'done') throw new Error(`The run is ${run?.state}: ${run?.error}`)
    return run
  }
  const sand = randomUUID()
  const k = { value: 10, unit: 'm/d' }
  const edge = (name: string, x: number, head: number) =>
    add('boundary', {
      name,
      kind: 'fixed head',
      line: [
        [x, 0],
        [x, 600],
      ],
      levels: [m(head)],
    })
  await save([add('material', { name: 'Sand', kx: k, ky: k }, sand)])
  await save([
    add('zone', { name: 'Everywhere', materialId: sand, base: m(-10), top: m(0) }),
    add('point', { name: 'P1', x: 500, y: 300 }, ids.point),
    edge('West', 0, 12),
    edge('East', 1000, 10),
    add('well', stripWell(0), ids.well),
    add(
      'case',
      {
        name: 'Base case',
        isBase: true,
        flow: 'confined',
        extent: { xMin: 0, xMax: 1000, yMin: 0, yMax: 600 },
        cellSize: m(50),
      },
      ids.base,
    ),
  ])
  return { project, ids, save, compute }
}

/** The well of the strip, pumping so many m³/d. */
export function stripWell(rate: number) {
  return { name: 'W1', x: 500, y: 300, kind: 'abstraction', rate: { value: rate, unit: 'm3/d' } }
}

/** An instrument of the strip with the level of its pipe, 15 m from the beginning of 2026. */
export function stripInstrument(
  name: string,
  x: number,
  id: string,
  more: Record<string, unknown> = {},
): RowChange[] {
  return [
    add('instrument', { name, kind: 'standpipe', x, y: 300, ...more }, id),
    add('reference level', {
      instrumentId: id,
      from: '2026-01-01T00:00:00Z',
      level: m(15),
      levelled: 'pipe top',
      reason: 'First survey',
    }),
  ]
}

/** A dip in metres below that level; null with a status such as "dry". */
export async function takeDip(
  database: Knex,
  reading: { projectId: number; instrumentId: string; at: string; dip: number | null; status?: string },
): Promise<void> {
  const { dip } = reading
  await database('readings').insert({
    project_id: reading.projectId,
    instrument_id: reading.instrumentId,
    quantity: 'dip',
    taken_at: new Date(reading.at),
    value: dip,
    entered: dip === null ? '' : String(dip),
    unit: 'm',
    status: reading.status ?? null,
    import_id: 0,
  })
}
