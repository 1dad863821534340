import { existsSync, rmSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import type { Knex } from 'knex'
import { environment } from '../app/environment.server.ts'
import { connectDatabase, disconnectDatabase } from '../database/connection.server.ts'
import { reportAndFail } from './services/report-and-fail.ts'

/** Takes every row out again, but not what the migrations have done. */
async function emptyTables(database: Knex): Promise<void> {
  const [tables] = await database.raw(
    "select table_name as name from information_schema.tables where table_schema = database() and table_name not like 'knex%'",
  )
  await database.transaction(async (connection) => {
    await connection.raw('set foreign_key_checks = 0')
    for (const { name } of tables as { name: string }[]) await connection.raw('truncate table ??', [name])
    await connection.raw('set foreign_key_checks = 1')
  })
}

/** Fills an empty database with the demo. A mark in the data folder tells a seeding that was cut short. */
async function seed(): Promise<void> {
  const { mode, database: settings } = environment()
  const folder = process.env.LAVANT_DATA
  if (mode !== 'demo') throw new Error('Only the demo is seeded (LAVANT_MODE=demo).')
  if (!folder) throw new Error('LAVANT_DATA is missing: the folder of the demo’s data.')
  const database = connectDatabase(settings)
  const mark = join(folder, 'seeding')
  try {
    if (existsSync(mark)) {
      console.log('Setting up the demo was cut short last time: doing it again …')
      await emptyTables(database)
    }
    const somebody = await database('users').first('id')
    // The demo's seed is being written: until then there is nobody to sign in as.
    if (!somebody && existsSync('database/seeds/demo.ts')) {
      console.log('Setting up the demo …')
      writeFileSync(mark, '')
      const { seedDemo } = await import('../database/seeds/demo.ts')
      await seedDemo(database)
    }
    rmSync(mark, { force: true })
  } finally {
    await disconnectDatabase()
  }
}

await seed().catch(reportAndFail)
