import { fileURLToPath } from 'node:url'
import type { Knex } from 'knex'
import { connectionSettings, type DatabaseSettings } from './database/connection.server.ts'

/** Settings of a connection that may migrate: the migrations are TypeScript, read through tsx. */
export function migrationSettings(settings: DatabaseSettings): Knex.Config {
  return {
    ...connectionSettings(settings),
    migrations: {
      directory: fileURLToPath(new URL('./database/migrations', import.meta.url)),
      extension: 'ts',
      loadExtensions: ['.ts'],
    },
  }
}
