import type { Knex } from 'knex'

/** Calculation packages. Once issued, a package and its PDF never change. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('packages', (table) => {
    table.increments('id')
    table.integer('project_id').unsigned().notNullable().references('projects.id')
    table.string('revision', 10).notNullable()
    table
      .enum('status', [
        'draft',
        'shared for check',
        'checked',
        'approved',
        'issued',
        'superseded',
        'withdrawn',
      ])
      .notNullable()
    table.string('purpose', 300).notNullable()
    table.string('reason', 500).notNullable()
    table.integer('run_id').unsigned().references('runs.id')
    table.integer('against_run_id').unsigned().references('runs.id')
    table.dateTime('fit_date', { precision: 3 })
    table.specificType('gathered', 'longtext')
    table.string('input_sha256', 64)
    table.string('sections_digest', 64)
    table.integer('job_id').unsigned().references('jobs.id')
    table.integer('file_id').unsigned().references('files.id')
    table.string('pdf_sha256', 64)
    table.dateTime('created_at', { precision: 3 }).notNullable()
    table.integer('created_by').unsigned().notNullable().references('users.id')
    table.dateTime('issued_at', { precision: 3 })
    table.integer('issued_by').unsigned().references('users.id')
    table.unique(['project_id', 'revision'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
