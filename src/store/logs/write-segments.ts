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
  /** The batch of all rows, where the file has no column `batch_seq`; else null. */
  readonly onlySeq: number | null
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

/** A log with as many rows, of no longer time, becomes one segment as it is: writing it again would double its cost. */
const WHOLE_ROWS = 1_000_000
const WHOLE_SPAN_MS = 32 * 86_400_000

/**
 * Makes segment files of a staged log: one for each calendar month (UTC); a large log of about a month becomes one as it
 * is, under the month of its first row. When it fails, none of them stays.
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
      const monthly = await readParts(connection, source)
      const whole = asWhole(monthly)
      if (whole) {
        const rows = sumRows(whole)
        segments.push(
          await placeSegment(
            stagedPath,
            { segment: parts.newId(), month: whole[0]!.month, rows, onlySeq: seq },
            parts,
          ),
        )
        return { segments, batchParts: whole }
      }
      const months = [...new Set(monthly.map(({ month }) => month))]
      for (const month of months) {
        const [fromMs, toMs] = monthBounds(month)
        const where = months.length > 1 ? `WHERE time >= ${fromMs} AND time < ${toMs}` : ''
        const query = `SELECT *, ${seq}::BIGINT AS batch_seq FROM ${source} ${where}`
        const expected = sumRows(monthly.filter((part) => part.month === month))
        segments.push(await writeSegment(connection, { month, query, expected }, parts))
      }
      return { segments, batchParts: monthly }
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
    return await placeSegment(temporary, { segment, month, rows, onlySeq: null }, parts)
  } finally {
    await rm(temporary, { force: true })
  }
}

async function placeSegment(
  path: string,
  about: Omit<WrittenSegment, 'bytes' | 'checksum'>,
  { files, space }: SegmentParts,
): Promise<WrittenSegment> {
  const { size: bytes } = await stat(path)
  const checksum = await fileChecksum(path)
  await space.reserve(bytes)
  await space.guard(bytes, () => moveDurably(path, files.path(about.segment)))
  return { ...about, bytes, checksum }
}

/** Parts of a log that is taken as it is, all under its first month; undefined for a log that is split. */
function asWhole(monthly: readonly BatchPart[]): BatchPart[] | undefined {
  const firstMs = Math.min(...monthly.map((part) => part.firstMs))
  const lastMs = Math.max(...monthly.map((part) => part.lastMs))
  if (!(sumRows(monthly) >= WHOLE_ROWS && lastMs - firstMs <= WHOLE_SPAN_MS)) return undefined
  const month = monthly[0]!.month
  const byTurbine = new Map<string, BatchPart>()
  for (const part of monthly) {
    const known = byTurbine.get(part.turbine)
    byTurbine.set(part.turbine, {
      month,
      turbine: part.turbine,
      firstMs: Math.min(known?.firstMs ?? Infinity, part.firstMs),
      lastMs: Math.max(known?.lastMs ?? -Infinity, part.lastMs),
      rows: (known?.rows ?? 0) + part.rows,
    })
  }
  return [...byTurbine.values()]
}

function sumRows(parts: readonly BatchPart[]): number {
  return parts.reduce((sum, { rows }) => sum + rows, 0)
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
