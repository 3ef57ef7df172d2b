import {
  quoteIdentifier,
  quoteText,
  readColumns,
  type ColumnKind,
  type Connection,
  type Scans,
} from '../duck/index.ts'

/** Rows of one turbine, sorted by time, as columns. */
export interface TurbineRows {
  readonly turbine: string
  /** Start of the interval, epoch ms; length n. */
  readonly time: Float64Array
  /** Channel -> values; length n; NaN = missing. */
  readonly numbers: Record<string, Float64Array>
  /** Text channel -> values; length n; null = missing. */
  readonly texts: Record<string, (string | null)[]>
}

/**
 * Reads a Parquet file of clean rows (turbine, time, channels), one entry per turbine in byte order of their names.
 *
 * @param scans  may read the file's folder.
 */
export async function readRows(scans: Scans, path: string): Promise<TurbineRows[]> {
  return scans.withConnection((connection) => rowsOf(connection, `read_parquet(${quoteText(path)})`))
}

/** Rows and extent of every turbine in a Parquet file of clean rows, byte order of their names. */
export interface TurbineCount {
  readonly turbine: string
  readonly rows: number
  readonly firstMs: number
  readonly lastMs: number
}

/** @param scans  may read the file's folder. */
export async function countRows(scans: Scans, path: string): Promise<TurbineCount[]> {
  const rows = await scans.withConnection((connection) =>
    connection.records(
      `SELECT turbine, count(*) AS row_count, min(time) AS first_ms, max(time) AS last_ms
       FROM read_parquet(${quoteText(path)}) GROUP BY turbine ORDER BY turbine COLLATE "C"`,
    ),
  )
  return rows.map((row) => ({
    turbine: row['turbine'] as string,
    rows: row['row_count'] as number,
    firstMs: row['first_ms'] as number,
    lastMs: row['last_ms'] as number,
  }))
}

/** As `readRows`, from any source of such rows: SQL after FROM. */
export async function rowsOf(connection: Connection, source: string): Promise<TurbineRows[]> {
  const described = await connection.records(`DESCRIBE SELECT * FROM ${source}`)
  const kinds: Record<string, ColumnKind> = {}
  for (const column of described) {
    kinds[String(column['column_name'])] = column['column_type'] === 'VARCHAR' ? 'text' : 'number'
  }
  const orderBy = `${quoteIdentifier('turbine')} COLLATE "C", ${quoteIdentifier('time')}`
  const read = await readColumns(connection, source, kinds, { orderBy })
  const columns: Record<string, Float64Array | (string | null)[]> = read.columns
  const rows = read.rows
  const names = columns['turbine'] as (string | null)[]
  const turbines: TurbineRows[] = []
  for (let from = 0; from < rows;) {
    let to = from + 1
    while (to < rows && names[to] === names[from]) to++
    turbines.push(slice(columns, kinds, { turbine: names[from] ?? '', from, to }))
    from = to
  }
  return turbines
}

function slice(
  columns: Record<string, Float64Array | (string | null)[]>,
  kinds: Record<string, ColumnKind>,
  part: { turbine: string; from: number; to: number },
): TurbineRows {
  const numbers: Record<string, Float64Array> = {}
  const texts: Record<string, (string | null)[]> = {}
  for (const [name, values] of Object.entries(columns)) {
    if (name === 'turbine' || name === 'time') continue
    const own = values.slice(part.from, part.to)
    if (kinds[name] === 'text') texts[name] = own as (string | null)[]
    else numbers[name] = own as Float64Array
  }
  return {
    turbine: part.turbine,
    time: (columns['time'] as Float64Array).slice(part.from, part.to),
    numbers,
    texts,
  }
}
