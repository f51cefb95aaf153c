import type { Knex } from 'knex'

/** UUIDs are compared byte by byte; ascii keeps their keys at 36 bytes. */
export function uuid(table: Knex.CreateTableBuilder, name: string): Knex.ColumnBuilder {
  return table.specificType(name, 'CHAR(36) CHARACTER SET ascii COLLATE ascii_bin')
}

/** Instants are UTC with milliseconds. */
export function instant(table: Knex.CreateTableBuilder, name: string): Knex.ColumnBuilder {
  return table.specificType(name, 'DATETIME(3)')
}

export function sha256(table: Knex.CreateTableBuilder, name: string): Knex.ColumnBuilder {
  return table.specificType(name, 'BINARY(32)')
}

export function double(table: Knex.CreateTableBuilder, name: string): Knex.ColumnBuilder {
  return table.specificType(name, 'DOUBLE')
}
