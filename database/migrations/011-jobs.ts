import type { Knex } from 'knex'

/** Long work: what is asked, how far it is, how it ended. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('jobs', (table) => {
    table.increments('id')
    table.integer('project_id').unsigned().references('projects.id')
    table.integer('user_id').unsigned().notNullable().references('users.id')
    table.enum('kind', ['solve', 'import', 'draw']).notNullable()
    table.enum('state', ['queued', 'running', 'done', 'failed', 'cancelled', 'interrupted']).notNullable()
    table.json('progress')
    table.string('error', 2000)
    table.dateTime('created_at', { precision: 3 }).notNullable()
    table.dateTime('started_at', { precision: 3 })
    table.dateTime('ended_at', { precision: 3 })
    table.index(['user_id', 'state'])
    table.index(['project_id', 'state'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
