import type { Connection, SqlValue } from './connection.ts'
import { quoteText } from './quote.ts'

/**
 * Writes the rows of a query to a Parquet file (zstd), in the order of the query.
 *
 * @param query  SELECT without a final semicolon.
 * @returns rows written. The file is not synced: the caller does that before making it known.
 */
export async function writeParquet(
  connection: Connection,
  query: string,
  path: string,
  values?: readonly SqlValue[],
): Promise<number> {
  return connection.run(`COPY (${query}) TO ${quoteText(path)} (FORMAT parquet, COMPRESSION zstd)`, values)
}
