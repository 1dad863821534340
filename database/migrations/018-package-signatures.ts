import type { Knex } from 'knex'

/** Who signed a package as originator, checker or approver, and what digest they signed. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('package_signatures', (table) => {
    table.integer('package_id').unsigned().notNullable().references('packages.id')
    table.enum('role', ['originator', 'checker', 'approver']).notNullable()
    table.integer('user_id').unsigned().notNullable().references('users.id')
    table.string('signed_sha256', 64).notNullable()
    table.dateTime('signed_at', { precision: 3 }).notNullable()
    table.primary(['package_id', 'role'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
