import type { Knex } from 'knex'

/** Every controlled row of every section, in all its versions. The version in force has no recorded_to. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('book_rows', (table) => {
    table.integer('project_id').unsigned().notNullable().references('projects.id')
    table.string('id', 36).notNullable()
    table.integer('version').unsigned().notNullable()
    table.string('section', 40).notNullable()
    table.string('kind', 40).notNullable()
    table.integer('position').notNullable().defaultTo(0)
    table.json('body').notNullable()
    table.dateTime('recorded_from', { precision: 3 }).notNullable()
    table.dateTime('recorded_to', { precision: 3 })
    table.integer('recorded_by').unsigned().notNullable().references('users.id')
    table.integer('ended_by').unsigned().references('users.id')
    table.primary(['project_id', 'id', 'version'])
    table.index(['project_id', 'kind', 'recorded_to'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
