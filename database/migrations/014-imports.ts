import type { Knex } from 'knex'

/** Imports of reading files: the file as it came, how it was read, and what became of its rows. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('imports', (table) => {
    table.increments('id')
    table.integer('project_id').unsigned().notNullable().references('projects.id')
    table.integer('file_id').unsigned().notNullable().references('files.id')
    table.integer('job_id').unsigned().references('jobs.id')
    table
      .enum('state', ['uploaded', 'previewing', 'previewed', 'committing', 'committed', 'undone', 'failed'])
      .notNullable()
    table.json('settings')
    table.json('preview')
    table.json('receipt')
    table.string('error', 2000)
    table.dateTime('created_at', { precision: 3 }).notNullable()
    table.integer('created_by').unsigned().notNullable().references('users.id')
    table.dateTime('committed_at', { precision: 3 })
    table.integer('committed_by').unsigned().references('users.id')
    table.dateTime('undone_at', { precision: 3 })
    table.integer('undone_by').unsigned().references('users.id')
    table.index(['project_id', 'state'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
