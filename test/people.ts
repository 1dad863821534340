import type { Knex } from 'knex'
import type { Role } from '../app/projects/permissions.ts'
import { startSession } from '../app/sign-in/sessions.server.ts'

/** Puts a person into the database. Returns the id. */
export async function makePerson(
  database: Knex,
  person: { name: string; email?: string; isAdministrator?: boolean },
): Promise<number> {
  const [id] = await database('users').insert({
    name: person.name,
    email: person.email ?? `${person.name.toLowerCase().replaceAll(/\W+/g, '.')}@firm.test`,
    is_administrator: person.isAdministrator ?? false,
    created_at: new Date(),
  })
  if (id === undefined) throw new Error('The database returned no id.')
  return id
}

/** Puts an empty project into the database, with its members. Returns the id. */
export async function makeProject(
  database: Knex,
  project: { number: string; createdBy: number; members?: readonly [userId: number, role: Role][] },
): Promise<number> {
  const [id] = await database('projects').insert({
    number: project.number,
    title: `Works ${project.number}`,
    client: 'Client',
    calc_reference: `C-${project.number}`,
    crs_epsg: 27700,
    vertical_datum: 'mOD',
    time_zone: 'Europe/London',
    created_at: new Date(),
    created_by: project.createdBy,
  })
  if (id === undefined) throw new Error('The database returned no id.')
  for (const [userId, role] of project.members ?? []) {
    await database('members').insert({ project_id: id, user_id: userId, role, from_at: new Date() })
  }
  return id
}

/** Starts a session for a person. Returns the Cookie header that a browser would send. */
export async function signIn(database: Knex, userId: number): Promise<string> {
  const header = await startSession(database, userId, new Request('http://lavant.test/'))
  return header.split(';')[0] ?? ''
}
