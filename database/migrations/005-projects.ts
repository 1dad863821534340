import type { Knex } from 'knex'

/** Calc books, with the settings that every number in them depends on. */
export async function up(database: Knex): Promise<void> {
  await database.schema.createTable('projects', (table) => {
    table.increments('id')
    table.string('number', 40).notNullable().unique()
    table.string('title', 200).notNullable()
    table.string('client', 200).notNullable()
    table.string('calc_reference', 60).notNullable()
    table.integer('crs_epsg').unsigned().notNullable()
    table.string('vertical_datum', 120).notNullable()
    table.string('time_zone', 60).notNullable()
    table.enum('length_unit', ['m', 'ft']).notNullable().defaultTo('m')
    table.enum('time_unit', ['d', 's']).notNullable().defaultTo('d')
    table.string('stage', 300).notNullable().defaultTo('')
    table.string('next_step', 300).notNullable().defaultTo('')
    table.dateTime('created_at', { precision: 3 }).notNullable()
    table.integer('created_by').unsigned().notNullable().references('users.id')
  })
}

export async function down(): Promise<void> {
  throw new Error('Migrations run forwards only: restore a backup instead.')
}
