import { InputError } from '../../errors.ts'
import type { CatalogueDriver } from '../catalogue/driver.ts'
import { insertSegment } from './batches.ts'
import { fileChecksum, segmentRows } from './segment-files.ts'
import { writeSegment, type SegmentParts, type WrittenSegment } from './write-segments.ts'

export interface CompactionLimits {
  /** This many segments of about the same size, of one site and month, become one. */
  readonly mergeCount: number
  /** Segments with as many rows are large enough to be left alone. */
  readonly largeRows: number
}

export const DEFAULT_COMPACTION: CompactionLimits = { mergeCount: 16, largeRows: 1_000_000 }

/**
 * Merges small segments of one site and month, and drops the rows of deleted batches. All rows of the batches that are
 * left stay, also the overruled ones, since deleting the batch that overrules them brings them back.
 *
 * Sizes go in steps of `mergeCount`, so that a row is written again only as often as its segment grows by that factor.
 * A segment whose file is damaged is reported and left as it is.
 * @returns merges made. Stops where nothing is due, or where the disk is too full for a merge.
 */
export async function compact(
  driver: CatalogueDriver,
  parts: SegmentParts & { report: (error: unknown) => void; isStopping: () => boolean },
  limits: CompactionLimits = DEFAULT_COMPACTION,
): Promise<number> {
  let merges = 0
  const damaged = new Set<string>()
  while (!parts.isStopping()) {
    const due = await nextDue(driver, limits, damaged)
    if (!due) return merges
    try {
      if (await merge(driver, parts, due)) merges++
    } catch (error) {
      if (error instanceof InputError && error.code === 'STORAGE_FULL') return merges
      if (!(error instanceof DamagedSegment)) throw error
      damaged.add(error.segment)
      parts.report(error)
    }
  }
  return merges
}

interface Due {
  readonly site: string
  readonly month: string
  readonly segments: readonly string[]
}

async function nextDue(
  driver: CatalogueDriver,
  limits: CompactionLimits,
  damaged: ReadonlySet<string>,
): Promise<Due | undefined> {
  const rows = await driver.query(
    `SELECT site, month, segment, row_count, dead_rows FROM segments
     WHERE dead_rows > 0 OR row_count < $1
     ORDER BY site NULLS LAST, month NULLS LAST, segment NULLS LAST`,
    [limits.largeRows],
  )
  const groups = new Map<string, Due & { segments: string[] }>()
  for (const row of rows) {
    const [site, month, segment] = [row['site'], row['month'], row['segment']] as [string, string, string]
    if (damaged.has(segment)) continue
    if ((row['dead_rows'] as number) > 0) return { site, month, segments: [segment] }
    const step = Math.floor(Math.log(row['row_count'] as number) / Math.log(limits.mergeCount))
    const key = JSON.stringify([site, month, step])
    const group = groups.get(key) ?? { site, month, segments: [] }
    groups.set(key, group)
    group.segments.push(segment)
  }
  return [...groups.values()].find(({ segments }) => segments.length >= limits.mergeCount)
}

/** False when the catalogue changed meanwhile; then nothing was done. */
async function merge(driver: CatalogueDriver, parts: SegmentParts, due: Due): Promise<boolean> {
  return parts.files.reading(async () => {
    const { segments, seqs } = await liveRows(driver, due)
    if (segments.length < due.segments.length) return false
    for (const { segment, checksum } of segments) {
      const found = await fileChecksum(parts.files.path(segment)).catch(() => 'no file')
      if (found !== checksum) throw new DamagedSegment(segment, checksum, found)
    }
    const written = await parts.scans.withConnection((connection) =>
      writeSegment(
        connection,
        {
          month: due.month,
          query: `SELECT * FROM ${segmentRows(parts.files, segments)}
            WHERE batch_seq IN (${seqs.join(', ')}) ORDER BY turbine, time, batch_seq`,
          expected: segments.reduce((sum, { rows, deadRows }) => sum + rows - deadRows, 0),
        },
        parts,
      ),
    )
    try {
      await replaceSegments(driver, due, segments, written)
    } catch (error) {
      if (!(error instanceof Outdated)) {
        // A commit that failed on a full disk may be on disk all the same. Without an answer the files stay.
        const kept = await driver.query('SELECT segment FROM segments WHERE segment = $1', [written.segment])
        if (kept.length > 0) return true
      }
      parts.files.giveUp([written])
      if (error instanceof Outdated) return false
      throw error
    }
    parts.files.giveUp(segments)
    return true
  })
}

interface Segment {
  readonly segment: string
  readonly rows: number
  readonly deadRows: number
  readonly bytes: number
  readonly checksum: string
  readonly onlySeq: number | null
}

/** One query, so that the list of live batches and the number of dead rows belong together. */
async function liveRows(driver: CatalogueDriver, due: Due): Promise<{ segments: Segment[]; seqs: number[] }> {
  const rows = await driver.query(
    `SELECT s.segment, s.row_count, s.dead_rows, s.byte_count, s.checksum, s.only_seq, b.seq
     FROM segments s JOIN segment_batches b ON b.segment = s.segment
     WHERE s.site = $1 AND s.month = $2`,
    [due.site, due.month],
  )
  const wanted = new Set(due.segments)
  const segments = new Map<string, Segment>()
  const seqs: number[] = []
  for (const row of rows) {
    const segment = row['segment'] as string
    if (!wanted.has(segment)) continue
    seqs.push(row['seq'] as number)
    segments.set(segment, {
      segment,
      rows: row['row_count'] as number,
      deadRows: row['dead_rows'] as number,
      bytes: row['byte_count'] as number,
      checksum: row['checksum'] as string,
      onlySeq: (row['only_seq'] ?? null) as number | null,
    })
  }
  return { segments: [...segments.values()], seqs }
}

async function replaceSegments(
  driver: CatalogueDriver,
  due: Due,
  segments: readonly Segment[],
  written: WrittenSegment,
): Promise<void> {
  await driver.write(async (transaction) => {
    for (const { segment, deadRows } of segments) {
      const removed = await transaction.query(
        'DELETE FROM segments WHERE segment = $1 AND dead_rows = $2 RETURNING segment',
        [segment, deadRows],
      )
      // A batch was deleted meanwhile, and what was written holds its rows.
      if (removed.length === 0) throw new Outdated()
      await transaction.query('UPDATE segment_batches SET segment = $2 WHERE segment = $1', [
        segment,
        written.segment,
      ])
    }
    await insertSegment(transaction, due.site, written)
  })
}

class Outdated extends Error {}

class DamagedSegment extends Error {
  readonly segment: string

  constructor(segment: string, expected: string, got: string) {
    super(`segment ${segment}: expected a file with checksum ${expected}, got ${got}; it is left as it is`)
    this.segment = segment
  }
}
