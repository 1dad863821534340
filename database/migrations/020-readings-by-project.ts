import type { Knex } from 'knex'

/**
 * The ids of rows are made by whoever adds them and are unique within a project only: readings of two projects whose
 * instruments share an id must neither meet nor shut each other out.
 */
export async function up(database: Knex): Promise<void> {
  await database.raw(
    `alter table readings drop primary key,
       add primary key (project_id, instrument_id, quantity, taken_at, revision)`,
  )
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
