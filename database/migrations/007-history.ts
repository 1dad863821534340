import type { Knex } from 'knex'

/** Who changed what, when and why. Rows are only ever added. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('history', (table) => {
    table.bigIncrements('id')
    table.integer('project_id').unsigned().references('projects.id')
    table.dateTime('at', { precision: 3 }).notNullable()
    table.integer('user_id').unsigned().references('users.id')
    table.string('section', 40)
    table.string('action', 60).notNullable()
    table.string('subject', 200).notNullable()
    table.json('before')
    table.json('after')
    table.string('reason', 500)
    table.index(['project_id', 'id'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
