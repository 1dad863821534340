import type { Database } from '~database/connection.server'

/** The id of whoever may sign in with an e-mail address; undefined for strangers and for those who left. */
export async function findActiveUser(db: Database, email: string): Promise<number | undefined> {
  const row = await db('users').where({ email }).whereNull('left_at').first<{ id: number } | undefined>('id')
  return row?.id
}
