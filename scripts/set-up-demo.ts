import { existsSync, rmSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import type { Knex } from 'knex'
import { environment } from '../app/environment.server.ts'
import { connectDatabase, disconnectDatabase } from '../database/connection.server.ts'
import { migrateDatabase, migrationReport } from './services/migrate-database.ts'
import { reportAndFail } from './services/report-and-fail.ts'

/**
 * Migrates the demo's database and fills it when it is empty. From the first table to the last row of the demo a
 * mark stands in the data folder (first argument): a set-up that was cut short is begun again from nothing, since
 * MariaDB cannot take a half-applied migration back.
 */
async function setUpDemo(folder: string): Promise<void> {
  const { mode, database: settings } = environment()
  if (mode !== 'demo') throw new Error('Only the demo is seeded (LAVANT_MODE=demo).')
  const mark = join(folder, 'setting-up')
  const database = connectDatabase(settings)
  try {
    if (existsSync(mark)) {
      console.log('Setting up the demo was cut short last time: beginning again …')
      await startAfresh(database, settings.name)
    } else if (await isWithoutTables(database)) {
      writeFileSync(mark, '', { mode: 0o600 })
    }
    console.log(migrationReport(await migrateDatabase(settings)))
    if (!(await database('users').first('id'))) {
      console.log('Setting up the demo …')
      const { seedDemo } = await import('./seed-demo.ts')
      await seedDemo(database)
    }
    rmSync(mark, { force: true })
  } finally {
    await disconnectDatabase()
  }
}

async function isWithoutTables(database: Knex): Promise<boolean> {
  const [tables] = await database.raw(
    'select 1 from information_schema.tables where table_schema = database() limit 1',
  )
  return tables.length === 0
}

async function startAfresh(database: Knex, schema: string): Promise<void> {
  await database.transaction(async (connection) => {
    await connection.raw('drop database if exists ??', [schema])
    await connection.raw('create database ?? character set utf8mb4 collate utf8mb4_unicode_ci', [schema])
    await connection.raw('use ??', [schema])
  })
}

const folder = process.argv[2]
if (!folder) throw new Error('Give the folder of the demo’s data.')
await setUpDemo(folder).catch(reportAndFail)
