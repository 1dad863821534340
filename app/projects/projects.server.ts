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

/** Every project of the firm, for administrators: the list only, no content. */
export async function allProjects(db: Database): Promise<Project[]> {
  const rows = await db<ProjectRow>('projects').orderBy('created_at', 'desc')
  return rows.map(fromRow)
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

/** Changes the settings of a project; the change and its before and after go to the history. */
export async function updateProject(
  db: Database,
  projectId: number,
  input: ProjectInput,
  userId: number,
): Promise<void> {
  await db.transaction(async (trx) => {
    const before = await trx<ProjectRow>('projects').where({ id: projectId }).forUpdate().first()
    await trx('projects').where({ id: projectId }).update(toRow(input))
    await recordHistory(trx, {
      projectId,
      userId,
      action: 'changed settings',
      subject: input.number,
      before,
      after: input,
    })
  })
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
