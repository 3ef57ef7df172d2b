import type { Connection, SqlValue } from './connection.ts'
import { quoteText } from './quote.ts'

/**
 * Writes the rows of a query to a Parquet file, in the order of the query. With snappy, Parquet version 2 writes
 * times that rise evenly as differences, which takes a tenth of their place.
 *
 * @param query  SELECT without a final semicolon.
 * @param compression  zstd for what is kept; snappy, larger and quicker to write, for what is read once.
 * @returns rows written. The file is not synced: the caller does that before making it known.
 */
export async function writeParquet(
  connection: Connection,
  query: string,
  path: string,
  values?: readonly SqlValue[],
  compression: 'zstd' | 'snappy' = 'zstd',
): Promise<number> {
  const version = compression === 'snappy' ? 'V2' : 'V1'
  return connection.run(
    `COPY (${query}) TO ${quoteText(path)} (FORMAT parquet, COMPRESSION ${compression}, PARQUET_VERSION ${version})`,
    values,
  )
}
