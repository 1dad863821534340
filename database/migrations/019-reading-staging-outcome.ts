import type { Knex } from 'knex'

/** What would become of a staged row, and the key by which it is held against the readings already there. */
export async function up(database: Knex): Promise<void> {
  await database.schema.alterTable('reading_staging', (table) => {
    table.enum('outcome', ['accepted', 'identical', 'repeated', 'conflict', 'refused'])
    table.index(['import_id', 'instrument_id', 'taken_at', 'quantity'], 'reading_staging_key')
    table.index(['import_id', 'outcome'], 'reading_staging_outcome')
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
