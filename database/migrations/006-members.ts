import type { Knex } from 'knex'

/** Who takes part in a project, in which role, from when to when. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('members', (table) => {
    table.increments('id')
    table.integer('project_id').unsigned().notNullable().references('projects.id')
    table.integer('user_id').unsigned().notNullable().references('users.id')
    table
      .enum('role', ['project manager', 'originator', 'checker', 'approver', 'data', 'client'])
      .notNullable()
    table.dateTime('from_at', { precision: 3 }).notNullable()
    table.dateTime('to_at', { precision: 3 })
    table.integer('invited_by').unsigned().references('users.id')
    table.index(['project_id', 'user_id', 'to_at'])
    table.index(['user_id', 'to_at'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
