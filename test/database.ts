import { execFile } from 'node:child_process'
import { createHash, randomBytes } from 'node:crypto'
import { readdirSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { promisify } from 'node:util'
import knex, { type Knex } from 'knex'
import { connectDatabase, connectionSettings, disconnectDatabase } from '../database/connection.server.ts'
import { testServices } from './services.ts'

const root = join(import.meta.dirname, '..')

export interface FreshDatabase {
  /** Pool on the schema; also what `database()` of the application answers in this test file. */
  database: Knex
  name: string
  /** Drops the schema and closes the pool. Call it in afterAll. */
  close: () => Promise<void>
}

/**
 * A schema of its own, migrated and empty, for one test file. The application's shared pool and
 * LAVANT_DATABASE_NAME are turned to it, so that loaders and actions called as functions use it as well.
 * Fast: the migrations run once a test run into a template, whose tables are then copied.
 */
export async function freshDatabase(): Promise<FreshDatabase> {
  const settings = testServices().database
  const name = `lavant_test_${randomBytes(6).toString('hex')}`
  const server = knex(connectionSettings({ ...settings, name: '' }))
  try {
    const template = await migratedTemplate(server)
    await copySchema(server, template, name)
  } finally {
    await server.destroy()
  }
  process.env.LAVANT_DATABASE_NAME = name
  await disconnectDatabase()
  const database = connectDatabase({ ...settings, name })
  async function close() {
    await database.raw('drop database ??', [name])
    await disconnectDatabase()
  }
  return { database, name, close }
}

/** Name of a schema with all migrations applied, made once for each state of the migrations folder. */
async function migratedTemplate(server: Knex): Promise<string> {
  const folder = join(root, 'database/migrations')
  const hash = createHash('sha256')
  for (const file of readdirSync(folder).sort()) hash.update(file).update(readFileSync(join(folder, file)))
  const template = `lavant_test_t_${hash.digest('hex').slice(0, 16)}`
  const building = `${template}_new`

  // Test files run in several processes: the first one builds, the others wait for it.
  await server.transaction(async (connection) => {
    await connection.raw('select get_lock(?, 120)', [template])
    try {
      const [found] = await connection.raw(
        'select 1 from information_schema.schemata where schema_name = ?',
        [template],
      )
      if (found.length > 0) return
      await connection.raw('drop database if exists ??', [building])
      await connection.raw('create database ?? character set utf8mb4 collate utf8mb4_unicode_ci', [building])
      // The very script that npm start runs; Vitest would not hand TypeScript migrations to Knex.
      await promisify(execFile)(process.execPath, ['--import', 'tsx', join(root, 'scripts/migrate.ts')], {
        cwd: root,
        env: { ...process.env, LAVANT_DATABASE_NAME: building },
      })
      await copySchemaOn(connection, building, template)
      await connection.raw('drop database ??', [building])
    } finally {
      await connection.raw('do release_lock(?)', [template])
    }
  })
  return template
}

async function copySchema(server: Knex, from: string, to: string): Promise<void> {
  await server.transaction((connection) => copySchemaOn(connection, from, to))
}

/** Copies tables with their foreign keys, and the rows that migrations put into them. */
async function copySchemaOn(connection: Knex, from: string, to: string): Promise<void> {
  await connection.raw('create database ?? character set utf8mb4 collate utf8mb4_unicode_ci', [to])
  await connection.raw('set foreign_key_checks = 0')
  const [tables] = await connection.raw(
    'select table_name as name from information_schema.tables where table_schema = ?',
    [from],
  )
  await connection.raw('use ??', [to])
  for (const { name } of tables as { name: string }[]) {
    const [[definition]] = await connection.raw('show create table ??.??', [from, name])
    // Not raw(): a question mark in a comment or a check would be taken for a binding.
    await connection.schema.raw((definition['Create Table'] as string).replaceAll('?', '\\?'))
    await connection.raw('insert into ?? select * from ??.??', [name, from, name])
  }
  await connection.raw('set foreign_key_checks = 1')
}
