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

interface Part {
  readonly turbine: string
  readonly seq: number
  readonly firstMs: number
  readonly lastMs: number
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
  const parts = await overlappingParts(driver, site, window)
  if (parts.length === 0) return { source: undefined, withOverruled: undefined, seqs: [], isSorted: true }
  const segments = [...new Map(parts.map((part) => [part.segment, part])).values()]
  const seqs = [...new Set(parts.map(({ seq }) => seq))].sort((a, b) => a - b)
  const hasDead = parts.some(({ deadRows }) => deadRows > 0)
  const conditions = [
    window.fromMs === undefined ? '' : `time >= ${Math.ceil(window.fromMs)}`,
    window.toMs === undefined ? '' : `time < ${Math.ceil(window.toMs)}`,
    window.turbines ? `turbine IN ${inList(window.turbines)}` : '',
    hasDead ? `batch_seq IN (${seqs.join(', ')})` : '',
  ].filter((condition) => condition !== '')
  const rows = `SELECT * FROM ${segmentRows(files, segments)}
    ${conditions.length > 0 ? `WHERE ${conditions.join(' AND ')}` : ''}`
  const contested = contestedTurbines(parts)
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

async function overlappingParts(driver: CatalogueDriver, site: string, window: LogWindow): Promise<Part[]> {
  const rows = await driver.query(
    `SELECT p.turbine, p.seq, p.first_ms, p.last_ms, b.segment, s.dead_rows, s.only_seq
     FROM batch_parts p
     JOIN segment_batches b ON b.seq = p.seq AND b.month = p.month
     JOIN segments s ON s.segment = b.segment
     WHERE p.site = $1 AND p.last_ms >= $2 AND p.first_ms < $3
     ORDER BY p.turbine NULLS LAST, p.first_ms NULLS LAST, p.seq NULLS LAST`,
    [site, Math.ceil(window.fromMs ?? -MAX_MS), Math.ceil(window.toMs ?? MAX_MS + 1)],
  )
  const wanted = window.turbines && new Set(window.turbines)
  return rows
    .filter((row) => !wanted || wanted.has(row['turbine'] as string))
    .map((row) => ({
      turbine: row['turbine'] as string,
      seq: row['seq'] as number,
      firstMs: row['first_ms'] as number,
      lastMs: row['last_ms'] as number,
      segment: row['segment'] as string,
      deadRows: row['dead_rows'] as number,
      onlySeq: (row['only_seq'] ?? null) as number | null,
    }))
}

/** The last moment of a Date. */
const MAX_MS = 8.64e15

/** Turbines of which two batches reach into each other's time. Parts come by turbine and start. */
function contestedTurbines(parts: readonly Part[]): string[] {
  const contested = new Set<string>()
  let turbine: string | undefined
  let reachedMs = -Infinity
  for (const part of parts) {
    if (part.turbine !== turbine) {
      turbine = part.turbine
      reachedMs = -Infinity
    }
    if (!(part.firstMs > reachedMs)) contested.add(part.turbine)
    reachedMs = Math.max(reachedMs, part.lastMs)
  }
  return [...contested]
}

function inList(texts: readonly string[]): string {
  return texts.length === 0 ? `(NULL)` : `(${texts.map(quoteText).join(', ')})`
}
