import type { SqlCell, SqlValue } from '../../duck/index.ts'

export type { SqlCell, SqlValue }
export type Row = Record<string, SqlCell>

/** Runs statements of one transaction. */
export interface Transaction {
  /** One statement with `$1`, `$2`, ...; the rows of SELECT or RETURNING. */
  query(sql: string, params?: readonly SqlValue[]): Promise<Row[]>
}

/**
 * What the store asks of the database that holds its catalogue. Statements that pass through here keep to what every
 * database understands: text, bigint, integer, double precision, boolean; epoch-ms bigint; JSON as text; ids made by
 * the program; `$1`; ON CONFLICT (key) DO UPDATE; RETURNING; explicit NULLS LAST. Text compares in byte order: where the
 * database does otherwise its migrations say COLLATE "C". Migrations and locks stand in the drivers.
 */
export interface CatalogueDriver {
  /** Reads, outside of any write. Sees every write that was acknowledged before. */
  query(sql: string, params?: readonly SqlValue[]): Promise<Row[]>
  /**
   * Runs `work` as one transaction, one after another. Resolves when it is on disk; when `work` or the commit fails,
   * nothing of it stays.
   * @throws InputError STORAGE_FULL, NOT_READY; and whatever `work` throws
   */
  write<T>(work: (transaction: Transaction) => Promise<T>): Promise<T>
  /** Waits for writes in the queue, then closes and lets go of the data folder. */
  close(): Promise<void>
}
