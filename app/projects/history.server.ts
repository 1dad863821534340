import type { Database } from '~database/connection.server'

export interface HistoryEntry {
  projectId?: number
  userId?: number
  section?: string
  action: string
  subject: string
  before?: unknown
  after?: unknown
  reason?: string
}

/** Adds one entry to the history; call it inside the transaction of the change. */
export async function recordHistory(db: Database, entry: HistoryEntry): Promise<void> {
  await db('history').insert({
    project_id: entry.projectId ?? null,
    at: new Date(),
    user_id: entry.userId ?? null,
    section: entry.section ?? null,
    action: entry.action,
    subject: entry.subject.slice(0, 200),
    before: entry.before === undefined ? null : JSON.stringify(entry.before),
    after: entry.after === undefined ? null : JSON.stringify(entry.after),
    reason: entry.reason ?? null,
  })
}

export interface HistoryLine {
  id: number
  at: Date
  person: string | null
  section: string | null
  action: string
  subject: string
  reason: string | null
}

/** The newest entries of a project. */
export async function recentHistory(db: Database, projectId: number, limit = 200): Promise<HistoryLine[]> {
  return db('history')
    .leftJoin('users', 'users.id', 'history.user_id')
    .where('history.project_id', projectId)
    .orderBy('history.id', 'desc')
    .limit(limit)
    .select(
      'history.id',
      'history.at',
      'users.name as person',
      'history.section',
      'history.action',
      'history.subject',
      'history.reason',
    )
}
