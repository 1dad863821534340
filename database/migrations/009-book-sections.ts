import type { Knex } from 'knex'

/** The digest of what each section holds now, and of what it and the sections it depends on held when checked. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('book_sections', (table) => {
    table.integer('project_id').unsigned().notNullable().references('projects.id')
    table.string('section', 40).notNullable()
    table.string('digest', 64)
    table.dateTime('changed_at', { precision: 3 })
    table.integer('changed_by').unsigned().references('users.id')
    table.string('checked_digest', 64)
    table.dateTime('checked_at', { precision: 3 })
    table.integer('checked_by').unsigned().references('users.id')
    table.primary(['project_id', 'section'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
