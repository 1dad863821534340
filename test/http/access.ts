import type { Role } from '../../app/projects/permissions.ts'
import { type Visitor, visitors } from './world.ts'

/** What becomes of a request. */
export type Outcome =
  /** The page or the file: 200. */
  | 'shown'
  /** To another page: a redirect that is not to the sign-in. */
  | 'led on'
  /** The deed is within the person's rights; an empty form may still be refused for what it lacks. */
  | 'let through'
  /** There is no such method here: 405. */
  | 'no method'
  /** Seen, but not for this role to do: 403. */
  | 'forbidden'
  /** As if it did not exist: 404. */
  | 'hidden'
  /** To the sign-in, or 401. */
  | 'sign in first'

export type Outcomes = Record<Visitor, Outcome>

export interface Access {
  /** What a reading has to say in its address, besides the path. */
  search?: string
  get: Outcomes
  /** The form that is sent, where an empty one does not even name what it is about. */
  form?: string
  post: Outcomes
}

type Answers = Partial<Record<Visitor, Outcome>>

function outcomes(other: Outcome, answers: Answers = {}): Outcomes {
  return Object.fromEntries(visitors.map((visitor) => [visitor, answers[visitor] ?? other])) as Outcomes
}

function each(who: readonly Role[], outcome: Outcome): Answers {
  return Object.fromEntries(who.map((role) => [role, outcome]))
}

const team: readonly Role[] = ['project manager', 'originator', 'checker', 'approver', 'data']

const strangers = { outsider: 'hidden', administrator: 'hidden', 'signed out': 'sign in first' } as const

/** For these members; other colleagues are told no, a client and everybody outside find nothing. */
function only(who: readonly Role[], outcome: Outcome): Outcomes {
  return outcomes('forbidden', { client: 'hidden', ...strangers, ...each(who, outcome) })
}

/** For every member, the client as well. */
function members(outcome: Outcome): Outcomes {
  return outcomes(outcome, strangers)
}

/** A method that a route of a project does not have: strangers do not even learn that. */
const none = members('no method')

const signedIn = (outcome: Outcome) => outcomes(outcome, { 'signed out': 'sign in first' })
const administrators = (outcome: Outcome) =>
  outcomes('hidden', { 'signed out': 'sign in first', administrator: outcome })

const readers: readonly Role[] = ['originator', 'data']

/** A section's page; what is entered in it goes to the route of the rows. */
const section: Access = { get: only(team, 'shown'), post: none }

/**
 * Every route of app/routes.ts: who gets what from reading (GET) and from doing (POST, with an empty form
 * unless one is given).
 */
export const access: Record<string, Access> = {
  '/': { get: outcomes('led on', { 'signed out': 'sign in first' }), post: outcomes('no method') },
  '/sign-in': { get: outcomes('led on', { 'signed out': 'shown' }), post: outcomes('let through') },
  '/sign-in/code': { get: outcomes('sign in first'), post: outcomes('sign in first') },
  '/sign-out': { get: outcomes('led on'), post: outcomes('sign in first') },
  '/mail': { get: outcomes('shown'), post: outcomes('no method') },
  '/health': { get: outcomes('shown'), post: outcomes('no method') },
  '/theme': { get: outcomes('led on'), post: outcomes('let through') },
  '/api/v1/solve': { get: outcomes('no method'), post: signedIn('let through') },
  '/api/v1/jobs/:jobId': {
    get: outcomes('hidden', { originator: 'shown', 'signed out': 'sign in first' }),
    post: outcomes('no method'),
  },
  '/account': { get: signedIn('shown'), post: signedIn('let through') },
  '/people': { get: administrators('shown'), post: administrators('let through') },
  '/projects': { get: signedIn('shown'), post: administrators('let through') },
  '/projects/new': { get: administrators('shown'), post: administrators('let through') },

  '/projects/:projectId': { get: members('led on'), post: none },
  '/projects/:projectId/cover': section,
  '/projects/:projectId/basis': section,
  '/projects/:projectId/ground': section,
  '/projects/:projectId/water': section,
  '/projects/:projectId/cases': section,
  '/projects/:projectId/heads': { get: only(team, 'shown'), post: only(['originator'], 'let through') },
  '/projects/:projectId/readings': section,
  '/projects/:projectId/readings/imports/:importId': {
    get: only(team, 'shown'),
    post: only(readers, 'let through'),
  },
  '/projects/:projectId/readings/instruments/:instrumentId': {
    get: only(team, 'shown'),
    post: only(readers, 'let through'),
  },
  '/projects/:projectId/fit': {
    get: only(team, 'shown'),
    form: 'run=:runId',
    post: only(['originator'], 'let through'),
  },
  '/projects/:projectId/checks': section,
  '/projects/:projectId/package': { get: only(team, 'shown'), post: only(team, 'let through') },
  '/projects/:projectId/progress': {
    get: members('shown'),
    post: outcomes('forbidden', { ...strangers, 'project manager': 'let through', client: 'hidden' }),
  },
  '/projects/:projectId/settings': {
    get: only(team, 'shown'),
    post: only(['project manager'], 'let through'),
  },
  '/projects/:projectId/history': section,
  '/projects/:projectId/rows': { get: none, post: only(team, 'let through') },
  '/projects/:projectId/check': { get: none, post: only(['checker'], 'let through') },
  '/projects/:projectId/files': { get: none, post: only(['originator'], 'let through') },
  '/projects/:projectId/files/:fileId': { get: only(team, 'shown'), post: none },
  '/projects/:projectId/runs': { get: none, post: only(['originator'], 'let through') },
  '/projects/:projectId/runs/:runId': { get: only(team, 'shown'), post: only(['originator'], 'let through') },
  '/projects/:projectId/runs/:runId/heads': { get: only(team, 'shown'), post: none },
  '/projects/:projectId/runs/:runId/model': { get: only(team, 'shown'), post: none },
  '/projects/:projectId/readings/imports': { get: none, post: only(readers, 'let through') },
  '/projects/:projectId/readings/imports/:importId/state': { get: only(team, 'shown'), post: none },
  '/projects/:projectId/readings/imports/:importId/receipt': { get: only(team, 'shown'), post: none },
  '/projects/:projectId/readings/instruments/:instrumentId/series': { get: only(team, 'shown'), post: none },
  '/projects/:projectId/fit/download': {
    search: '?run=:runId&date=2026-01-01',
    get: only(team, 'shown'),
    post: none,
  },
  '/projects/:projectId/packages/:packageId': { get: only(team, 'shown'), post: none },
  '/projects/:projectId/packages/:packageId/pdf': { get: members('shown'), post: none },
  '/*': { get: outcomes('hidden'), post: outcomes('hidden') },
}
