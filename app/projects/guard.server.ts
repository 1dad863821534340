import { createContext, type RouterContextProvider } from 'react-router'
import { type SignedIn, signedInContext } from '~/sign-in/guard.server'
import { database } from '~database/connection.server'
import { can, type Member, type Role, type Subject, type Verb } from './permissions'
import type { Project } from './project'
import { findProject } from './projects.server'

export interface Membership {
  project: Project
  member: Member
  user: SignedIn
}

/** Filled by the middleware of the project layout, for every loader and action below it. */
export const membershipContext = createContext<Membership>()

/** Not found, in words that do not say whether the thing exists. */
export function notFound(): Response {
  return new Response('There is nothing here, or it is not yours to see.', { status: 404 })
}

/**
 * The membership of the signed-in person in the project of the URL.
 * Throws 404 for a stranger, so that nobody learns which projects exist.
 */
export async function findMembership(
  context: Readonly<RouterContextProvider>,
  projectIdText: string | undefined,
): Promise<Membership> {
  const user = context.get(signedInContext)
  if (!projectIdText || !/^\d{1,9}$/.test(projectIdText)) throw notFound()
  const projectId = Number(projectIdText)
  const db = database()
  const row = await db('members')
    .where({ project_id: projectId, user_id: user.userId })
    .whereNull('to_at')
    .first<{ role: Role } | undefined>('role')
  const project = row && (await findProject(db, projectId))
  if (!row || !project) throw notFound()
  return { project, member: { userId: user.userId, name: user.name, role: row.role }, user }
}

/**
 * The membership, once the person may do this. A client gets 404 for what is not theirs to see; a colleague who may
 * see the book but not do this gets 403 with the reason.
 */
export function permit<V extends Verb>(
  context: Readonly<RouterContextProvider>,
  verb: V,
  subject: Subject<V>,
): Membership {
  const membership = context.get(membershipContext)
  if (can(membership.member, verb, subject)) return membership
  if (verb === 'view' || !can(membership.member, 'view', 'book')) throw notFound()
  throw new Response(`Your role (${membership.member.role}) may not ${verb} ${subject}.`, { status: 403 })
}

/** A whole-number id from the URL. Throws 404 for anything else. */
export function idFrom(text: string | undefined): number {
  if (!text || !/^\d{1,9}$/.test(text)) throw notFound()
  return Number(text)
}
