import { createWriteStream } from 'node:fs'
import { rm } from 'node:fs/promises'
import { Readable } from 'node:stream'
import { pipeline } from 'node:stream/promises'
import { table } from 'arquero'
import {
  columnFromValues,
  dictionary,
  float64,
  int32,
  int64,
  tableFromColumns,
  tableToIPC,
  timestamp,
  TimeUnit,
  utf8,
} from '@uwdata/flechette'
import { csvToParquet, type CsvColumn, type Store } from '../store/index.ts'

/** Name -> kind, in the order of the columns. `time`: epoch ms, printed as ISO 8601 in UTC; `integer`: as it is. */
export type TableSchema = Readonly<Record<string, CsvColumn>>

/** Some rows of a table. A column that the part lacks is missing in all of its rows. */
export interface TablePart {
  readonly rows: number
  /** NaN and null = missing; of the part's length. */
  readonly columns: Readonly<Record<string, ArrayLike<number> | ArrayLike<string | null>>>
}

/** Rows that are turned into text at once. */
const CHUNK_ROWS = 4096

/** CSV in pieces of some thousand rows; a missing value is an empty field. */
export function* csvPieces(schema: TableSchema, parts: Iterable<TablePart>): Generator<string> {
  yield headerOf(schema)
  for (const part of parts) yield* linesOf(schema, part)
}

async function* csvPiecesOf(
  schema: TableSchema,
  parts: Iterable<TablePart> | AsyncIterable<TablePart>,
): AsyncGenerator<string> {
  yield headerOf(schema)
  for await (const part of parts) yield* linesOf(schema, part)
}

function headerOf(schema: TableSchema): string {
  return `${Object.keys(schema).join(',')}\n`
}

function* linesOf(schema: TableSchema, part: TablePart): Generator<string> {
  const names = Object.keys(schema)
  for (let from = 0; from < part.rows; from += CHUNK_ROWS) {
    const to = Math.min(from + CHUNK_ROWS, part.rows)
    const cells = Object.fromEntries(
      names.map((name) => [name, cellsOf(part, name, schema[name]!, from, to)]),
    )
    const text = table(cells, names).toCSV({ header: false })
    yield text.endsWith('\n') ? text : `${text}\n`
  }
}

/**
 * Writes a table to a Parquet file by way of a CSV beside it, so that memory does not grow with the rows.
 * @param path  in a folder that `scans` may read and write
 */
export async function writeParquetTable(
  scans: Store['scans'],
  path: string,
  schema: TableSchema,
  parts: Iterable<TablePart> | AsyncIterable<TablePart>,
): Promise<void> {
  const csv = `${path}.csv`
  try {
    await pipeline(Readable.from(csvPiecesOf(schema, parts)), createWriteStream(csv))
    await csvToParquet(scans, csv, path, schema)
  } finally {
    await rm(csv, { force: true })
  }
}

/** An Arrow IPC stream. Missing is null; texts are dictionary-encoded; times are UTC milliseconds. Held in memory whole. */
export function arrowBytes(schema: TableSchema, parts: readonly TablePart[]): Uint8Array {
  const columns = Object.entries(schema).map(([name, kind]) => {
    const values = function* () {
      for (const part of parts) {
        const cells = part.columns[name]
        for (let i = 0; i < part.rows; i++) yield known(cells?.[i])
      }
    }
    const type = {
      number: () => float64(),
      text: () => dictionary(utf8(), int32()),
      time: () => timestamp(TimeUnit.MILLISECOND, 'UTC'),
      integer: () => int64(),
    }[kind]()
    return [name, columnFromValues(values(), type)] as const
  })
  const bytes = tableToIPC(tableFromColumns(columns as never), { format: 'stream' })
  if (bytes === null) throw new Error('arrow: expected bytes, got none')
  return bytes
}

function cellsOf(part: TablePart, name: string, kind: CsvColumn, from: number, to: number): unknown[] {
  const values = part.columns[name]
  return Array.from({ length: to - from }, (_, i) => {
    const value = known(values?.[from + i])
    return kind === 'time' && typeof value === 'number' ? new Date(value).toISOString() : value
  })
}

function known(value: number | string | null | undefined): number | string | null {
  return value === undefined || (typeof value === 'number' && !Number.isFinite(value)) ? null : value
}
