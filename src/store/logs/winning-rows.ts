import { quoteText } from '../../duck/index.ts'
import type { CatalogueDriver } from '../catalogue/driver.ts'
import { segmentRows, type SegmentFiles } from './segment-files.ts'

export interface LogWindow {
  /** Epoch ms, inclusive; default: from the first row. */
  readonly fromMs?: number
  /** Epoch ms, exclusive; default: to the last row. */
  readonly toMs?: number
  /** Default: all. */
  readonly turbines?: readonly string[]
}

/** Which rows count in a window of a site. Holds for as long as the files may be read (`SegmentFiles.reading`). */
export interface WinningRows {
  /** SQL of rows with `batch_seq`, no two of the same turbine and time; undefined when there are none. */
  readonly source: string | undefined
  /** SQL of all rows of the window, also those that a later batch overruled; undefined where none can be. */
  readonly withOverruled: string | undefined
  /** Numbers of the batches that reach into the window; rising. */
  readonly seqs: readonly number[]
  /** Whether the rows come sorted by turbine and time as they are. */
  readonly isSorted: boolean
}

interface Overlap {
  readonly segments: readonly Segment[]
  /** Rising. */
  readonly seqs: readonly number[]
  /** Turbines of which two batches reach into each other's time; byte order. */
  readonly contested: readonly string[]
}

interface Segment {
  readonly segment: string
  readonly deadRows: number
  readonly onlySeq: number | null
}

/**
 * Works out from the catalogue where a later batch may overrule an earlier one, so that only those turbines pay for it.
 * One query, since a batch deleted or a segment merged between two of them would bring dead rows back.
 */
export async function winningRows(
  driver: CatalogueDriver,
  files: SegmentFiles,
  site: string,
  window: LogWindow,
): Promise<WinningRows> {
  const { segments, seqs, contested } = await overlap(driver, site, window)
  if (segments.length === 0) {
    return { source: undefined, withOverruled: undefined, seqs: [], isSorted: true }
  }
  const hasDead = segments.some(({ deadRows }) => deadRows > 0)
  const conditions = [
    window.fromMs === undefined ? '' : `time >= ${Math.ceil(window.fromMs)}`,
    window.toMs === undefined ? '' : `time < ${Math.ceil(window.toMs)}`,
    window.turbines ? `turbine IN ${inList(window.turbines)}` : '',
    hasDead ? `batch_seq IN (${seqs.join(', ')})` : '',
  ].filter((condition) => condition !== '')
  const rows = `SELECT * FROM ${segmentRows(files, segments)}
    ${conditions.length > 0 ? `WHERE ${conditions.join(' AND ')}` : ''}`
  if (contested.length === 0) {
    return { source: `(${rows})`, withOverruled: undefined, seqs, isSorted: segments.length === 1 }
  }
  const turbines = inList(contested)
  const own = `(SELECT * FROM (${rows}) WHERE turbine IN ${turbines})`
  // A join over three columns spills to disk; a window over whole rows fails at 256 MB on two months of 1 Hz rows.
  const winners = `SELECT turbine, time, max(batch_seq) AS batch_seq FROM ${own} GROUP BY turbine, time`
  return {
    source: `(SELECT * FROM (${rows}) WHERE turbine NOT IN ${turbines}
      UNION ALL SELECT * FROM ${own} SEMI JOIN (${winners}) USING (turbine, time, batch_seq))`,
    withOverruled: `(${rows})`,
    seqs,
    isSorted: false,
  }
}

/** The database sums up: ten thousand batches of five turbines are fifty thousand parts, and a few dozen segments. */
async function overlap(driver: CatalogueDriver, site: string, window: LogWindow): Promise<Overlap> {
  const turbines = window.turbines ?? []
  if (window.turbines?.length === 0) return { segments: [], seqs: [], contested: [] }
  const only =
    turbines.length > 0 ? `AND p.turbine IN (${turbines.map((_, i) => `$${i + 4}`).join(', ')})` : ''
  const rows = await driver.query(
    `WITH parts AS (
       SELECT p.turbine, p.seq, b.segment, s.dead_rows, s.only_seq,
         p.first_ms <= max(p.last_ms) OVER (
           PARTITION BY p.turbine ORDER BY p.first_ms NULLS LAST, p.seq NULLS LAST
           ROWS BETWEEN UNBOUNDED PRECEDING AND 1 PRECEDING
         ) AS is_contested
       FROM batch_parts p
       JOIN segment_batches b ON b.seq = p.seq AND b.month = p.month
       JOIN segments s ON s.segment = b.segment
       WHERE p.site = $1 AND p.last_ms >= $2 AND p.first_ms < $3 ${only}
     )
     SELECT seq, segment, dead_rows, only_seq, NULL AS turbine FROM parts
     GROUP BY seq, segment, dead_rows, only_seq
     UNION ALL SELECT NULL, NULL, NULL, NULL, turbine FROM parts WHERE is_contested GROUP BY turbine
     ORDER BY seq NULLS LAST, segment NULLS LAST, turbine NULLS LAST`,
    [site, Math.ceil(window.fromMs ?? -MAX_MS), Math.ceil(window.toMs ?? MAX_MS + 1), ...turbines],
  )
  const segments = new Map<string, Segment>()
  const seqs = new Set<number>()
  const contested: string[] = []
  for (const row of rows) {
    if (row['turbine'] !== null) {
      contested.push(row['turbine'] as string)
      continue
    }
    const segment = row['segment'] as string
    seqs.add(row['seq'] as number)
    segments.set(segment, {
      segment,
      deadRows: row['dead_rows'] as number,
      onlySeq: (row['only_seq'] ?? null) as number | null,
    })
  }
  return { segments: [...segments.values()], seqs: [...seqs], contested }
}

/** The last moment of a Date. */
const MAX_MS = 8.64e15

function inList(texts: readonly string[]): string {
  return texts.length === 0 ? `(NULL)` : `(${texts.map(quoteText).join(', ')})`
}
