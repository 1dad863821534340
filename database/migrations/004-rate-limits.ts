import type { Knex } from 'knex'

/** Counters of rate-limiter-flexible; the columns are the ones it asks for. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('rate_limits', (table) => {
    table.string('key', 255).primary()
    table.integer('points').notNullable().defaultTo(0)
    table.bigInteger('expire').unsigned()
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
