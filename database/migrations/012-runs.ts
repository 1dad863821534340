import type { Knex } from 'knex'

/** Runs of a case: the frozen model file, and the record that came back. A finished run never changes. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('runs', (table) => {
    table.increments('id')
    table.integer('project_id').unsigned().notNullable().references('projects.id')
    table.integer('number').unsigned().notNullable()
    table.string('case_id', 36).notNullable()
    table.integer('case_version').unsigned().notNullable()
    table.string('case_name', 120).notNullable()
    table.integer('job_id').unsigned().references('jobs.id')
    table.enum('state', ['queued', 'running', 'done', 'failed', 'cancelled', 'interrupted']).notNullable()
    table.specificType('input', 'longtext').notNullable()
    table.string('input_sha256', 64).notNullable()
    table.string('sections_digest', 64).notNullable()
    table.string('engine', 20)
    table.boolean('converged')
    table.specificType('result', 'longtext')
    table.string('heads_key', 255)
    table.string('heads_sha256', 64)
    table.integer('heads_format').unsigned()
    table.string('error', 2000)
    table.dateTime('created_at', { precision: 3 }).notNullable()
    table.dateTime('started_at', { precision: 3 })
    table.dateTime('ended_at', { precision: 3 })
    table.integer('created_by').unsigned().notNullable().references('users.id')
    table.unique(['project_id', 'number'])
    table.index(['project_id', 'case_id'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
