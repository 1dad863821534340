import type { Knex } from 'knex'

/** One record for each code sent: what the code is for, its hash, and how often it was tried. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('sign_in_codes', (table) => {
    table.string('id', 36).primary()
    table.string('email', 254).notNullable().index()
    table.string('purpose', 200).notNullable()
    table.string('code_hash', 64).notNullable()
    table.integer('attempts').unsigned().notNullable().defaultTo(0)
    table.dateTime('created_at', { precision: 3 }).notNullable()
    table.dateTime('expires_at', { precision: 3 }).notNullable()
    table.dateTime('used_at', { precision: 3 })
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
