import type { Knex } from 'knex'

/** Signed-in browsers. Only the SHA-256 of the session id is kept here. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('sessions', (table) => {
    table.string('id_hash', 64).primary()
    table.integer('user_id').unsigned().notNullable().references('users.id')
    table.dateTime('created_at', { precision: 3 }).notNullable()
    table.dateTime('last_seen_at', { precision: 3 }).notNullable()
    table.dateTime('expires_at', { precision: 3 }).notNullable()
    table.dateTime('ended_at', { precision: 3 })
    table.index(['user_id', 'ended_at'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
