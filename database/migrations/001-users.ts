import type { Knex } from 'knex'

/** People of the firm and of its clients. An address is kept in lower case. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('users', (table) => {
    table.increments('id')
    table.string('email', 254).notNullable().unique()
    table.string('name', 120).notNullable()
    table.boolean('is_administrator').notNullable().defaultTo(false)
    table.dateTime('created_at', { precision: 3 }).notNullable()
    table.dateTime('first_signed_in_at', { precision: 3 })
    table.dateTime('left_at', { precision: 3 })
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
