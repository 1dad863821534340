import { setTimeout as pause } from 'node:timers/promises'
import knex, { type Knex } from 'knex'
import type { DatabaseSettings } from '../../database/connection.server.ts'
import { migrationSettings } from '../../knexfile.ts'

const PATIENCE_SECONDS = 60

/** Waits for a database that is still starting, as in a set-up of several machines; then says why it gave up. */
async function untilAnswering(database: Knex): Promise<void> {
  const deadline = Date.now() + 1000 * PATIENCE_SECONDS
  for (;;) {
    try {
      await database.raw('select 1')
      return
    } catch (error) {
      const code = error instanceof Error && 'code' in error ? String(error.code) : ''
      const mayStillCome = ['ECONNREFUSED', 'ENOTFOUND', 'ETIMEDOUT', 'EAI_AGAIN'].includes(code)
      if (!mayStillCome || Date.now() > deadline) throw error
      await pause(500)
    }
  }
}

/**
 * Brings the schema to the newest state and returns the names of the migrations that were needed.
 * Two servers that start together take turns, by a lock that ends with the connection of its holder: Knex's own
 * would stay for ever behind a migration that was killed, so it is freed once ours is held.
 */
export async function migrateDatabase(settings: DatabaseSettings): Promise<string[]> {
  const database = knex(migrationSettings(settings))
  const name = `migrate ${settings.name}`
  try {
    await untilAnswering(database)
    return await database.transaction(async (connection) => {
      const [[lock]] = await connection.raw('select get_lock(?, ?) as held', [name, PATIENCE_SECONDS])
      if (lock.held !== 1) throw new Error('Another server has been migrating this database for a minute.')
      try {
        await database.migrate.forceFreeMigrationsLock()
        const [, names] = (await database.migrate.latest()) as [number, string[]]
        return names
      } finally {
        await connection.raw('do release_lock(?)', [name])
      }
    })
  } finally {
    await database.destroy()
  }
}

/** What was migrated, in a sentence. */
export function migrationReport(names: string[]): string {
  return names.length === 0 ? 'The database is up to date.' : `Migrated the database: ${names.join(', ')}`
}
