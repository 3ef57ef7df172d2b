import { quoteText, readColumns, type Scans } from '../duck/index.ts'

/** Rows of one turbine in a span of time, sorted by time. */
export interface HighRateSpan {
  /** Epoch ms; length n. */
  readonly time: Float64Array
  /** Channel -> values; length n; NaN = missing. */
  readonly numbers: Record<string, Float64Array>
}

/** A file of clean high-rate rows that is read piece by piece. */
export interface HighRateSource {
  /** Its number columns, beside time. */
  readonly numbers: readonly string[]
  /** Rows with fromMs <= time < toMs, epoch ms. The arrays own their memory. */
  read(
    turbine: string,
    columns: readonly string[],
    span: { readonly fromMs: number; readonly toMs: number },
  ): Promise<HighRateSpan>
}

/**
 * Opens a Parquet file of clean rows (turbine, time, channels), sorted by turbine and time, so that a span costs what it
 * holds and not what the file holds.
 *
 * @param scans  may read the file's folder.
 */
export async function openHighRate(scans: Scans, path: string): Promise<HighRateSource> {
  const source = `read_parquet(${quoteText(path)})`
  const described = await scans.withConnection((connection) =>
    connection.records(`DESCRIBE SELECT * EXCLUDE (turbine, time) FROM ${source}`),
  )
  const numbers = described
    .filter((column) => column['column_type'] !== 'VARCHAR')
    .map((column) => String(column['column_name']))
  return {
    numbers,
    read: (turbine, columns, { fromMs, toMs }) =>
      scans.withConnection(async (connection) => {
        const kinds = Object.fromEntries(['time', ...columns].map((name) => [name, 'number' as const]))
        const read = await readColumns(connection, source, kinds, {
          where: 'turbine = $1 AND time >= $2 AND time < $3',
          orderBy: 'time',
          values: [turbine, Math.ceil(fromMs), Math.ceil(toMs)],
        })
        const { time, ...rest } = read.columns
        return { time: time!, numbers: rest }
      }),
  }
}
