import { DuckDBDoubleVector, type DuckDBDataChunk } from '@duckdb/node-api'
import { toBound, type Connection, type SqlValue } from './connection.ts'
import { quoteIdentifier } from './quote.ts'

/** `number`: Float64Array, NaN for NULL; BIGINT up to 2^53 is exact. `text`: strings, null for NULL. */
export type ColumnKind = 'number' | 'text'

export type Columns<K extends Record<string, ColumnKind>> = {
  [Name in keyof K]: K[Name] extends 'text' ? (string | null)[] : Float64Array
}

export interface ReadOptions {
  /** SQL after WHERE. */
  readonly where?: string
  /** SQL after ORDER BY. Without it the order is that of the source. */
  readonly orderBy?: string
  /** Bound to `$1`, `$2`, ... of source, where and orderBy. */
  readonly values?: readonly SqlValue[]
}

const FIRST_CAPACITY = 4096

/**
 * The one reader of columns. A NULL leaves garbage in a vector of the driver, so NULL becomes NaN in SQL.
 *
 * @param source  SQL after FROM: a quoted table, `read_parquet('...')` or a query in brackets.
 * @param columns  name -> kind; names are quoted here. A name that the source lacks is an error of DuckDB.
 * @returns one array per column, all of length `rows`. Equal texts share one string.
 * @example readColumns(connection, "read_parquet('x.parquet')", { time: 'number', turbine: 'text' })
 */
export async function readColumns<K extends Record<string, ColumnKind>>(
  connection: Connection,
  source: string,
  columns: K,
  options: ReadOptions = {},
): Promise<{ rows: number; columns: Columns<K> }> {
  const names = Object.keys(columns)
  const numbers = new Map<string, Float64Array>()
  const texts = new Map<string, (string | null)[]>()
  for (const name of names) {
    if (columns[name] === 'text') texts.set(name, [])
    else numbers.set(name, new Float64Array(FIRST_CAPACITY))
  }
  let rows = 0
  for await (const chunk of streamColumns(connection, source, columns, options)) {
    for (const name of names) {
      const part = chunk.columns[name]
      const list = texts.get(name)
      if (list) for (const text of part as (string | null)[]) list.push(text)
      else numbers.set(name, append(numbers.get(name)!, rows, part as Float64Array))
    }
    rows += chunk.rows
  }
  const result: Record<string, Float64Array | (string | null)[]> = {}
  for (const name of names) result[name] = texts.get(name) ?? numbers.get(name)!.slice(0, rows)
  return { rows, columns: result as Columns<K> }
}

/** The same, chunk by chunk (about 2,000 rows each), so that memory does not grow with the length of the source. */
export async function* streamColumns<K extends Record<string, ColumnKind>>(
  connection: Connection,
  source: string,
  columns: K,
  options: ReadOptions = {},
): AsyncGenerator<{ rows: number; columns: Columns<K> }> {
  const names = Object.keys(columns)
  if (names.length === 0) throw new Error('columns: expected at least one')
  const bound = options.values?.map(toBound)
  const sql = selectSql(source, columns, options)
  const result = bound ? await connection.native.stream(sql, bound) : await connection.native.stream(sql)
  const known = new Map<string, string>()
  for (;;) {
    const chunk = await result.fetchChunk()
    if (!chunk || chunk.rowCount === 0) return
    const part: Record<string, Float64Array | (string | null)[]> = {}
    names.forEach((name, i) => {
      part[name] =
        columns[name] === 'text'
          ? (chunk.getColumnValues(i) as (string | null)[]).map((text) => shared(known, text))
          : doubles(chunk, i)
    })
    yield { rows: chunk.rowCount, columns: part as Columns<K> }
  }
}

/** A copy: the vector's memory is the driver's and is used again. */
function doubles(chunk: DuckDBDataChunk, index: number): Float64Array {
  const vector = chunk.getColumnVector(index)
  if (!(vector instanceof DuckDBDoubleVector)) throw new Error(`column ${index}: expected DOUBLE`)
  const copy = new Float64Array(chunk.rowCount)
  for (let i = 0; i < copy.length; i++) copy[i] = vector.getItem(i) ?? NaN
  return copy
}

function selectSql(source: string, columns: Record<string, ColumnKind>, options: ReadOptions): string {
  const list = Object.entries(columns).map(([name, kind]) => {
    const column = quoteIdentifier(name)
    return kind === 'text' ? `${column}::VARCHAR` : `coalesce(${column}::DOUBLE, 'nan'::DOUBLE)`
  })
  return [
    `SELECT ${list.join(', ')} FROM ${source}`,
    options.where ? `WHERE ${options.where}` : '',
    options.orderBy ? `ORDER BY ${options.orderBy}` : '',
  ].join(' ')
}

/** Turbine names and states repeat millions of times: one string each. Free text would fill the map: it is bounded. */
function shared(known: Map<string, string>, text: string | null): string | null {
  if (text === null) return null
  const first = known.get(text)
  if (first !== undefined) return first
  if (known.size < 10_000) known.set(text, text)
  return text
}

function append(target: Float64Array, used: number, part: Float64Array): Float64Array {
  let grown = target
  if (used + part.length > target.length) {
    grown = new Float64Array(Math.max(target.length * 2, used + part.length))
    grown.set(target.subarray(0, used))
  }
  grown.set(part, used)
  return grown
}
