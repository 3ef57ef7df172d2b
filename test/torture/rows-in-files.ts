import { DuckDBInstance } from '@duckdb/node-api'
import type { SentLog } from './ledger.ts'

/** Rows that name a log as theirs. */
export interface RowsOfLog {
  readonly n: number
  readonly rows: number
  /** Different pairs of turbine and time. */
  readonly keys: number
  /** Rows at a time of the log with the values that were sent. */
  readonly right: number
}

/**
 * Counts the rows in Parquet files by the log that they are of, with a database of its own. The values are those of
 * `logLines`.
 */
export async function rowsInFiles(paths: readonly string[], logs: readonly SentLog[]): Promise<RowsOfLog[]> {
  if (paths.length === 0 || logs.length === 0) return []
  const instance = await DuckDBInstance.create(':memory:', { threads: '2' })
  try {
    const connection = await instance.connect()
    const sent = logs.map(({ n, firstMs, minutes }) => `(${n}, ${firstMs}::BIGINT, ${minutes})`)
    const files = paths.map((path) => `'${path.replaceAll("'", "''")}'`)
    const reader = await connection.runAndReadAll(
      `WITH log(n, first_ms, minutes) AS (VALUES ${sent.join(', ')}),
       rows AS (
         SELECT round((power - 1000) * 8)::INTEGER AS n, turbine, time, wind_speed, vane
         FROM read_parquet([${files.join(', ')}], union_by_name = true)
       )
       SELECT rows.n, count(*)::INTEGER, count(DISTINCT (turbine, time))::INTEGER,
         count(*) FILTER (
           (time - first_ms) % 60000 = 0 AND (time - first_ms) // 60000 BETWEEN 0 AND minutes - 1
           AND wind_speed = 4 + ((time - first_ms) // 60000 % 80) / 8 AND vane = ((time - first_ms) // 60000 % 41) / 4 - 5
         )::INTEGER
       FROM rows LEFT JOIN log ON log.n = rows.n GROUP BY rows.n ORDER BY rows.n`,
    )
    return reader.getRows().map((row) => {
      const [n, rows, keys, right] = row.map(Number) as [number, number, number, number]
      return { n, rows, keys, right }
    })
  } finally {
    instance.closeSync()
  }
}
