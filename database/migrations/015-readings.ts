import type { Knex } from 'knex'

/** Readings as they came: SI value, entered text and unit, state. Heads are derived, never stored. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('readings', (table) => {
    table.integer('project_id').unsigned().notNullable()
    table.string('instrument_id', 36).notNullable()
    table.enum('quantity', ['dip', 'level', 'pressure head']).notNullable()
    table.dateTime('taken_at', { precision: 3 }).notNullable()
    table.integer('revision').unsigned().notNullable().defaultTo(1)
    table.double('value')
    table.string('entered', 40).notNullable()
    table.string('unit', 12).notNullable()
    table.string('operator', 1)
    table.string('status', 30)
    table.enum('quality', ['raw', 'provisional', 'checked', 'rejected']).notNullable().defaultTo('raw')
    table.integer('import_id').unsigned().notNullable()
    table.integer('file_row').unsigned()
    table.primary(['instrument_id', 'quantity', 'taken_at', 'revision'])
    table.index(['import_id'])
    table.index(['project_id', 'instrument_id', 'taken_at'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
