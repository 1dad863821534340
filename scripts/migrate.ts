import { setTimeout as pause } from 'node:timers/promises'
import knex, { type Knex } from 'knex'
import { environment } from '../app/environment.server.ts'
import { migrationSettings } from '../knexfile.ts'
import { reportAndFail } from './services/report-and-fail.ts'

const PATIENCE_MILLISECONDS = 60_000

/** Waits for a database that is still starting, as in a set-up of several machines; then says why it gave up. */
async function untilAnswering(database: Knex): Promise<void> {
  const deadline = Date.now() + PATIENCE_MILLISECONDS
  for (;;) {
    try {
      await database.raw('select 1')
      return
    } catch (error) {
      const code = error instanceof Error && 'code' in error ? error.code : undefined
      const mayStillCome =
        code === 'ECONNREFUSED' || code === 'ENOTFOUND' || code === 'ETIMEDOUT' || code === 'EAI_AGAIN'
      if (!mayStillCome || Date.now() > deadline) throw error
      await pause(500)
    }
  }
}

async function migrate(): Promise<void> {
  const database = knex(migrationSettings(environment().database))
  try {
    await untilAnswering(database)
    const [, names] = (await database.migrate.latest()) as [number, string[]]
    console.log(
      names.length === 0 ? 'The database is up to date.' : `Migrated the database: ${names.join(', ')}`,
    )
  } finally {
    await database.destroy()
  }
}

await migrate().catch(reportAndFail)
