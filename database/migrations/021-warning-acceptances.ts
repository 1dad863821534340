import type { Knex } from 'knex'

/**
 * Who accepted which warning of a run, when and why. Rows are only ever added: a warning of another run, even of the
 * same input, is another warning.
 */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('warning_acceptances', (table) => {
    table.increments('id')
    table.integer('run_id').unsigned().notNullable().references('runs.id')
    table.string('code', 60).notNullable()
    table.text('warning').notNullable()
    table.string('warning_sha256', 64).notNullable()
    table.string('reason', 1000).notNullable()
    table.dateTime('accepted_at', { precision: 3 }).notNullable()
    table.integer('accepted_by').unsigned().notNullable().references('users.id')
    table.unique(['run_id', 'code', 'warning_sha256'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
