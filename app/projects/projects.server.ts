import { createHash } from 'node:crypto'
import type { Database } from '~database/connection.server'
import { recordHistory } from './history.server'
import type { Role } from './permissions'
import type { Project, ProjectInput } from './project'

interface ProjectRow {
  id: number
  number: string
  title: string
  client: string
  calc_reference: string
  crs_epsg: number
  vertical_datum: string
  time_zone: string
  length_unit: 'm' | 'ft'
  time_unit: 'd' | 's'
  stage: string
  next_step: string
  created_at: Date
}

function fromRow(row: ProjectRow): Project {
  return {
    id: row.id,
    number: row.number,
    title: row.title,
    client: row.client,
    calcReference: row.calc_reference,
    crsEpsg: row.crs_epsg,
    verticalDatum: row.vertical_datum,
    timeZone: row.time_zone,
    units: { length: row.length_unit, time: row.time_unit },
    stage: row.stage,
    nextStep: row.next_step,
    createdAt: row.created_at,
  }
}

function toRow(input: ProjectInput) {
  return {
    number: input.number,
    title: input.title,
    client: input.client,
    calc_reference: input.calcReference,
    crs_epsg: input.crsEpsg,
    vertical_datum: input.verticalDatum,
    time_zone: input.timeZone,
    length_unit: input.lengthUnit,
    time_unit: input.timeUnit,
  }
}

export async function findProject(db: Database, projectId: number): Promise<Project | undefined> {
  const row = await db<ProjectRow>('projects').where({ id: projectId }).first()
  return row && fromRow(row)
}

/** Projects in which a person is a member now, newest first, with the role held. */
export async function projectsOf(db: Database, userId: number): Promise<(Project & { role: Role })[]> {
  const rows = await db('projects')
    .join('members', 'members.project_id', 'projects.id')
    .where('members.user_id', userId)
    .whereNull('members.to_at')
    .orderBy('projects.created_at', 'desc')
    .select<(ProjectRow & { role: Role })[]>('projects.*', 'members.role')
  return rows.map((row) => ({ ...fromRow(row), role: row.role }))
}

export interface ProjectLine {
  id: number
  number: string
  title: string
  client: string
  managers: string[]
}

/** Every project of the firm with its project managers, for administrators: the list only, no content. */
export async function allProjects(db: Database): Promise<ProjectLine[]> {
  const rows = await db<ProjectRow>('projects')
    .orderBy('created_at', 'desc')
    .select('id', 'number', 'title', 'client')
  const managers = await db('members')
    .join('users', 'users.id', 'members.user_id')
    .where('members.role', 'project manager')
    .whereNull('members.to_at')
    .orderBy('users.name')
    .select<{ project_id: number; name: string }[]>('members.project_id', 'users.name')
  return rows.map((row) => ({
    ...row,
    managers: managers.filter((manager) => manager.project_id === row.id).map((manager) => manager.name),
  }))
}

/** Creates a project and makes its creator the project manager. Throws on a number already taken (ER_DUP_ENTRY). */
export async function createProject(db: Database, input: ProjectInput, userId: number): Promise<number> {
  return db.transaction(async (trx) => {
    const now = new Date()
    const [id] = await trx('projects').insert({ ...toRow(input), created_at: now, created_by: userId })
    if (id === undefined) throw new Error('The database returned no project id.')
    await trx('members').insert({ project_id: id, user_id: userId, role: 'project manager', from_at: now })
    await recordHistory(trx, {
      projectId: id,
      userId,
      action: 'created project',
      subject: `${input.number} ${input.title}`,
      after: input,
    })
    return id
  })
}

/** The settings of a project as its form has them. */
export function settingsOf(project: Project): ProjectInput {
  return {
    number: project.number,
    title: project.title,
    client: project.client,
    calcReference: project.calcReference,
    crsEpsg: project.crsEpsg,
    verticalDatum: project.verticalDatum,
    timeZone: project.timeZone,
    lengthUnit: project.units.length,
    timeUnit: project.units.time,
  }
}

/** Short text that changes with the settings: a form carries the one it was made from. */
export function settingsVersion(project: Project): string {
  return createHash('sha256')
    .update(JSON.stringify(settingsOf(project)))
    .digest('hex')
    .slice(0, 16)
}

/**
 * Changes the settings of a project; the change and its before and after go to the history. `seen` is the
 * settingsVersion that the form was made from; when somebody else saved meanwhile, nothing is changed and the
 * answer says so. Throws on a number already taken (ER_DUP_ENTRY).
 */
export async function updateProject(
  db: Database,
  projectId: number,
  input: ProjectInput,
  userId: number,
  seen: string,
): Promise<'changed meanwhile' | undefined> {
  return db.transaction(async (trx) => {
    const row = await trx<ProjectRow>('projects').where({ id: projectId }).forUpdate().first()
    if (!row) throw new Error(`There is no project ${projectId}.`)
    const before = fromRow(row)
    if (settingsVersion(before) !== seen) return 'changed meanwhile'
    await trx('projects').where({ id: projectId }).update(toRow(input))
    await recordHistory(trx, {
      projectId,
      userId,
      action: 'changed settings',
      subject: input.number,
      before: settingsOf(before),
      after: input,
    })
    return undefined
  })
}

/** A project of this number that the same person made less than a minute ago: the same form sent twice. */
export async function justCreated(db: Database, number: string, userId: number): Promise<number | undefined> {
  const row = await db('projects')
    .where({ number, created_by: userId })
    .where('created_at', '>', new Date(Date.now() - 60_000))
    .first<{ id: number } | undefined>('id')
  return row?.id
}

/** Whether MariaDB refused a value because another row has it. */
export function isNumberTaken(error: unknown): boolean {
  return error instanceof Error && 'code' in error && error.code === 'ER_DUP_ENTRY'
}

/** The two lines that the client reads first: where the work stands, and what comes next. */
export async function updateProgress(
  db: Database,
  projectId: number,
  lines: { stage: string; nextStep: string },
  userId: number,
): Promise<void> {
  await db.transaction(async (trx) => {
    const before = await trx<ProjectRow>('projects')
      .where({ id: projectId })
      .forUpdate()
      .first('stage', 'next_step')
    await trx('projects').where({ id: projectId }).update({ stage: lines.stage, next_step: lines.nextStep })
    await recordHistory(trx, {
      projectId,
      userId,
      section: 'progress',
      action: 'changed progress lines',
      subject: lines.stage,
      before,
      after: lines,
    })
  })
}
