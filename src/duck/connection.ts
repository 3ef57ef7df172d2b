import type { DuckDBConnection } from '@duckdb/node-api'

/** What may be bound to a parameter. Whole numbers are bound as BIGINT, other numbers as DOUBLE. */
export type SqlValue = string | number | boolean | bigint | null

/** A cell of a small result. BIGINT comes as number; beyond 2^53 it is an error. */
export type SqlCell = string | number | boolean | null

/** One connection of an instance: one transaction, one owner of temporary tables. */
export interface Connection {
  /** Runs one statement; answers the number of rows it changed. */
  run(sql: string, values?: readonly SqlValue[]): Promise<number>
  /** All rows of a small result as records. Data of logs is read by `readColumns`, never by this. */
  records(sql: string, values?: readonly SqlValue[]): Promise<Record<string, SqlCell>[]>
  /** Stops the statement that runs on this connection; it rejects. */
  interrupt(): void
  /** The driver's own connection, for what this interface does not offer. */
  readonly native: DuckDBConnection
}

export function wrapConnection(native: DuckDBConnection): Connection {
  return {
    native,
    async run(sql, values) {
      const result = values ? await native.run(sql, values.map(toBound)) : await native.run(sql)
      return result.rowsChanged
    },
    async records(sql, values) {
      const reader = values
        ? await native.runAndReadAll(sql, values.map(toBound))
        : await native.runAndReadAll(sql)
      const names = reader.columnNames()
      return reader.getRows().map((row) => {
        const record: Record<string, SqlCell> = {}
        names.forEach((name, i) => (record[name] = toCell(row[i], name)))
        return record
      })
    },
    interrupt() {
      native.interrupt()
    },
  }
}

/** A whole number binds as BIGINT, so that epoch milliseconds keep their type in comparisons and inserts. */
export function toBound(value: SqlValue): string | number | boolean | bigint | null {
  return typeof value === 'number' && Number.isSafeInteger(value) && !Object.is(value, -0)
    ? BigInt(value)
    : value
}

function toCell(value: unknown, name: string): SqlCell {
  if (value === null || value === undefined) return null
  if (typeof value === 'bigint') {
    const number = Number(value)
    if (!Number.isSafeInteger(number)) throw new Error(`column ${name}: ${value} does not fit a number`)
    return number
  }
  if (typeof value === 'string' || typeof value === 'number' || typeof value === 'boolean') return value
  throw new Error(`column ${name}: cast it to text, boolean, bigint or double in SQL`)
}
