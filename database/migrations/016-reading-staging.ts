import type { Knex } from 'knex'

/** Rows of an import between preview and commit. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('reading_staging', (table) => {
    table.integer('import_id').unsigned().notNullable()
    table.integer('file_row').unsigned().notNullable()
    table.integer('project_id').unsigned().notNullable()
    table.string('instrument_id', 36)
    table.enum('quantity', ['dip', 'level', 'pressure head'])
    table.dateTime('taken_at', { precision: 3 })
    table.double('value')
    table.string('entered', 200)
    table.string('unit', 12)
    table.string('operator', 1)
    table.string('status', 30)
    table.string('refusal', 300)
    table.primary(['import_id', 'file_row'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
