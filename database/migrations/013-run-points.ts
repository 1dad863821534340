import type { Knex } from 'knex'

/** Heads of a run at the named points, in metres, so that pages need not open the head field. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('run_points', (table) => {
    table.integer('run_id').unsigned().notNullable().references('runs.id')
    table.string('point_id', 36).notNullable()
    table.string('name', 120).notNullable()
    table.double('x').notNullable()
    table.double('y').notNullable()
    table.double('head')
    table.string('why', 200)
    table.primary(['run_id', 'point_id'])
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
