import type { Knex } from 'knex'

/** Files in S3: name, size and SHA-256. A stored file never changes. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('files', (table) => {
    table.increments('id')
    table.integer('project_id').unsigned().notNullable().references('projects.id')
    table.string('kind', 40).notNullable()
    table.string('name', 255).notNullable()
    table.string('content_type', 120).notNullable()
    table.bigInteger('bytes').unsigned().notNullable()
    table.string('sha256', 64).notNullable()
    table.string('s3_key', 255).notNullable().unique()
    table.dateTime('stored_at', { precision: 3 }).notNullable()
    table.integer('stored_by').unsigned().notNullable().references('users.id')
    table.index(['project_id', 'kind'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
