import knex, { type Knex } from 'knex'

export type Database = Knex | Knex.Transaction

export interface DatabaseSettings {
  host: string
  port: number
  name: string
  user: string
  password: string
}

/**
 * Settings of every connection to MariaDB. Times are UTC; a BIGINT beyond 2^53 stays exact as text;
 * columns avoid DECIMAL, which would come back as text.
 */
export function connectionSettings(settings: DatabaseSettings): Knex.Config {
  return {
    client: 'mysql2',
    connection: {
      host: settings.host,
      port: settings.port,
      database: settings.name,
      user: settings.user,
      password: settings.password,
      timezone: 'Z',
      charset: 'utf8mb4',
      supportBigNumbers: true,
    },
    pool: { min: 0, max: 10 },
  }
}

let shared: Knex | undefined

/** Opens the one pool of this process; a second call with a pool still open keeps the first. */
export function connectDatabase(settings: DatabaseSettings): Knex {
  shared ??= knex(connectionSettings(settings))
  return shared
}

/** The pool of this process. Throws where nobody has connected yet. */
export function database(): Knex {
  if (!shared) throw new Error('The database is not connected: call connectDatabase first.')
  return shared
}

/** Closes the pool, so that a thread, a script or a test can end. */
export async function disconnectDatabase(): Promise<void> {
  const open = shared
  shared = undefined
  await open?.destroy()
}
