import { rm, stat } from 'node:fs/promises'
import { join } from 'node:path'
import { quoteText, writeParquet, type Connection, type Scans } from '../../duck/index.ts'
import { moveDurably } from '../durable-file.ts'
import { asStorageFull, type Space } from '../space.ts'
import { fileChecksum, type SegmentFiles } from './segment-files.ts'

/** A segment file that is in its place, and not yet in the catalogue. */
export interface WrittenSegment {
  readonly segment: string
  /** YYYY-MM, UTC. */
  readonly month: string
  readonly rows: number
  readonly bytes: number
  /** SHA-256 of the file. */
  readonly checksum: string
}

/** Rows of one turbine in one month of a batch. */
export interface BatchPart {
  readonly month: string
  readonly turbine: string
  readonly firstMs: number
  readonly lastMs: number
  readonly rows: number
}

export interface SegmentParts {
  readonly scans: Scans
  readonly files: SegmentFiles
  readonly space: Space
  readonly tempFolder: string
  readonly newId: () => string
}

/**
 * Splits a staged log by calendar month (UTC) into segment files. When it fails, none of them stays.
 * @throws InputError STORAGE_FULL
 */
export async function writeSegments(
  stagedPath: string,
  seq: number,
  parts: SegmentParts,
): Promise<{ segments: WrittenSegment[]; batchParts: BatchPart[] }> {
  const source = `read_parquet(${quoteText(stagedPath)})`
  const segments: WrittenSegment[] = []
  try {
    return await parts.scans.withConnection(async (connection) => {
      const batchParts = await readParts(connection, source)
      const months = [...new Set(batchParts.map(({ month }) => month))]
      for (const month of months) {
        const [fromMs, toMs] = monthBounds(month)
        const where = months.length > 1 ? `WHERE time >= ${fromMs} AND time < ${toMs}` : ''
        const query = `SELECT *, ${seq}::BIGINT AS batch_seq FROM ${source} ${where}`
        const expected = batchParts.reduce((sum, part) => (part.month === month ? sum + part.rows : sum), 0)
        segments.push(await writeSegment(connection, { month, query, expected }, parts))
      }
      return { segments, batchParts }
    })
  } catch (error) {
    parts.files.giveUp(segments)
    throw asStorageFull(error)
  }
}

/**
 * Writes the rows of a query as one segment file: temporary name, content synced, renamed, folder synced.
 *
 * @param segment.query  rows with `batch_seq`, by turbine and time
 * @param segment.expected  rows that must come out; any other number is a fault of this program
 */
export async function writeSegment(
  connection: Connection,
  { month, query, expected }: { month: string; query: string; expected: number },
  parts: SegmentParts,
): Promise<WrittenSegment> {
  const segment = parts.newId()
  const temporary = join(parts.tempFolder, `${segment}.parquet`)
  try {
    const rows = await writeParquet(connection, query, temporary)
    if (rows !== expected) throw new Error(`segment of ${month}: expected ${expected} rows, got ${rows}`)
    const { size: bytes } = await stat(temporary)
    const checksum = await fileChecksum(temporary)
    await parts.space.reserve(bytes)
    await parts.space.guard(bytes, () => moveDurably(temporary, parts.files.path(segment)))
    return { segment, month, rows, bytes, checksum }
  } finally {
    await rm(temporary, { force: true })
  }
}

async function readParts(connection: Connection, source: string): Promise<BatchPart[]> {
  const rows = await connection.records(
    `SELECT strftime(make_timestamp(time * 1000), '%Y-%m') AS month, turbine, min(time) AS first_ms,
       max(time) AS last_ms, count(*) AS row_count
     FROM ${source} GROUP BY ALL ORDER BY month, turbine`,
  )
  return rows.map((row) => ({
    month: row['month'] as string,
    turbine: row['turbine'] as string,
    firstMs: row['first_ms'] as number,
    lastMs: row['last_ms'] as number,
    rows: row['row_count'] as number,
  }))
}

/** First moment of the month and of the next one, epoch ms. */
function monthBounds(month: string): [number, number] {
  const [year, number] = month.split('-').map(Number) as [number, number]
  return [Date.UTC(year, number - 1), Date.UTC(year, number)]
}
