import { rm, stat } from 'node:fs/promises'
import { join } from 'node:path'
import { writeParquet, type Scans } from '../../duck/index.ts'
import { InputError } from '../../errors.ts'
import type { Receipt } from '../../sheet/index.ts'
import type { CatalogueDriver } from '../catalogue/driver.ts'
import { moveDurably, removeDurably } from '../durable-file.ts'
import { checkId } from '../ids.ts'
import { requireSite } from '../sites.ts'
import { rowsOf, type TurbineRows } from '../read-rows.ts'
import { asStorageFull, type Space } from '../space.ts'
import {
  batchesOf,
  deleteBatch,
  deleteSite,
  findByContent,
  insertBatch,
  listBatches,
  nextSeq,
  requireBatch,
  type StoredBatch,
} from './batches.ts'
import { compact, type CompactionLimits } from './compaction.ts'
import { fileChecksum, segmentFiles, type SegmentFiles } from './segment-files.ts'
import { winningRows, type LogWindow, type WinningRows } from './winning-rows.ts'
import { writeSegments, type WrittenSegment } from './write-segments.ts'

export interface StagedBatch {
  readonly site: string
  /**
   * Parquet in the data folder: turbine VARCHAR, time BIGINT (epoch ms), DOUBLE and VARCHAR channels; sorted by turbine
   * and time, each pair once. Taken over or left, as it suits: it is not to be used afterwards.
   */
  readonly path: string
  /** CSV of rejected rows, taken over; null when there are none. */
  readonly rejectedPath: string | null
  readonly receipt: Receipt
  readonly reading: Record<string, unknown>
  /** The same for the same bytes read the same way, and for nothing else: a hash over both. */
  readonly contentKey: string
}

/** Rows of one turbine on one day (UTC). */
export interface DayRows {
  readonly dayMs: number
  readonly rows: number
  readonly firstMs: number
  readonly lastMs: number
}

/** The rows that count in a window, in a file, and where they come from. */
export interface ReadWindow {
  readonly path: string | null
  readonly rows: number
  readonly channels: string[]
  /** Rows of the window that a later batch overruled. */
  readonly overruled: number
  /** Batches that reach into the window, earliest first. */
  readonly batches: readonly StoredBatch[]
}

export interface TurbineExtent {
  readonly turbine: string
  readonly firstMs: number
  readonly lastMs: number
}

export interface LogStore {
  /**
   * Keeps a log, all of it or nothing. Where the site has the same content already, that batch is answered and nothing
   * changes. Turbines that the site file lacks are added to it, with a warning in the receipt.
   * @throws InputError SITE_NOT_FOUND, STORAGE_FULL, LOG_COLUMN_MAP for more turbines than a site can have
   */
  add(staged: StagedBatch): Promise<{ batch: StoredBatch; isNew: boolean }>
  find(site: string, contentKey: string): Promise<StoredBatch | undefined>
  /** @throws InputError SITE_NOT_FOUND, BATCH_NOT_FOUND */
  get(site: string, batch: string): Promise<StoredBatch>
  /** Newest first; `limit` 1 to 1000. @throws InputError SITE_NOT_FOUND, BAD_REQUEST */
  list(
    site: string,
    page: { after?: string; limit: number },
  ): Promise<{ batches: StoredBatch[]; next: string | null }>
  /** Rows that this batch overruled count again. @throws InputError SITE_NOT_FOUND, BATCH_NOT_FOUND */
  remove(site: string, batch: string): Promise<void>
  /** The site file and all logs of the site. True when there was such a site. */
  removeSite(site: string): Promise<boolean>
  /** CSV of rejected rows; null when there are none. @throws InputError SITE_NOT_FOUND, BATCH_NOT_FOUND */
  rejectedPath(site: string, batch: string): Promise<string | null>
  /**
   * Writes the rows that count in a window to a Parquet file, by turbine (byte order) and time; each pair once. It is
   * the caller's to remove. `path` is null when there are no rows.
   * @param window.folder  where to; default: the temporary folder
   * @throws InputError SITE_NOT_FOUND, STORAGE_FULL
   */
  readWindow(site: string, window?: LogWindow & { folder?: string }): Promise<ReadWindow>
  /**
   * The rows that count in a window, in memory: one entry per turbine, byte order of their names. Writes no file, so it
   * answers on a full disk as long as the rows fit into the memory of scans.
   * @throws InputError SITE_NOT_FOUND
   */
  rows(site: string, window?: LogWindow): Promise<TurbineRows[]>
  /** Days (UTC) on which a turbine has rows. A turbine without rows has none. @throws InputError SITE_NOT_FOUND */
  days(site: string, turbine: string, window?: { fromMs?: number; toMs?: number }): Promise<DayRows[]>
  /** First and last time of every turbine that has rows. */
  extents(site: string): Promise<TurbineExtent[]>
  /** Runs the merges that are due; answers how many. Goes on by itself after `add` and `remove`. */
  compact(): Promise<number>
  /** Names segments whose file is missing or differs from its checksum. Reads everything. */
  verify(): Promise<string[]>
  /** Waits for what runs in the background. */
  close(): Promise<void>
}

export interface LogStoreParts {
  readonly scans: Scans
  readonly space: Space
  readonly segmentsFolder: string
  readonly rejectedFolder: string
  readonly tempFolder: string
  readonly newId: () => string
  readonly clock: () => number
  readonly compaction: CompactionLimits
  readonly report: (error: unknown) => void
}

export function logStore(driver: CatalogueDriver, options: LogStoreParts): LogStore {
  const { scans, space, tempFolder, clock, report } = options
  const newId = () => checkId(options.newId())
  const files = segmentFiles(options.segmentsFolder, space, report)
  const rejectedPath = (batch: string) => join(options.rejectedFolder, `${batch}.csv`)

  let isClosing = false
  const parts = { scans, files, space, tempFolder, newId, report, isStopping: () => isClosing }
  let compacting: Promise<number> = Promise.resolve(0)
  const runCompaction = () => {
    compacting = compacting.catch(() => 0).then(() => compact(driver, parts, options.compaction))
    return compacting
  }
  let isNudged = false
  /** One run at most waits behind the one that is going on. */
  const nudge = () => {
    if (isNudged) return
    isNudged = true
    void compacting
      .catch(() => 0)
      .then(() => {
        isNudged = false
        return runCompaction()
      })
      .catch(report)
  }

  const removeRejected = async (batch: string) => {
    const bytes = await stat(rejectedPath(batch)).then(
      ({ size }) => size,
      () => 0,
    )
    if (await removeDurably(rejectedPath(batch))) space.release(bytes)
  }
  const keepRejected = async (batch: string, from: string) => {
    const { size } = await stat(from)
    await space.reserve(size)
    await space.guard(size, () => moveDurably(from, rejectedPath(batch)))
  }

  return {
    async add(staged) {
      await requireSite(driver, staged.site)
      const same = await findByContent(driver, staged.site, staged.contentKey)
      if (same) return { batch: same, isNew: false }
      const batch = newId()
      const seq = await nextSeq(driver)
      const hasRejected = staged.rejectedPath !== null
      let segments: readonly WrittenSegment[] = []
      try {
        const written = await writeSegments(staged.path, seq, parts)
        segments = written.segments
        if (staged.rejectedPath !== null) await keepRejected(batch, staged.rejectedPath)
        const { site, contentKey, reading, receipt } = staged
        const added = { batch, site, seq, contentKey, reading, receipt, hasRejected, createdMs: clock() }
        const result = await insertBatch(driver, added, segments, written.batchParts).catch(
          (error: unknown) => whetherKept(driver, added, error),
        )
        if (!result.isNew) {
          files.giveUp(segments)
          if (hasRejected) await removeRejected(batch)
        }
        nudge()
        return result
      } catch (error) {
        // Where the catalogue could not say whether the batch is in it, the files stay; the next start decides.
        if (!(error instanceof Unsettled)) {
          files.giveUp(segments)
          if (hasRejected) await removeRejected(batch).catch(report)
        }
        throw error instanceof Unsettled ? error.cause : error
      }
    },
    find: (site, contentKey) => findByContent(driver, site, contentKey),
    get: (site, batch) => requireBatch(driver, site, batch),
    list: (site, page) => listBatches(driver, site, page),
    async remove(site, batch) {
      const { removed, segments } = await deleteBatch(driver, site, batch)
      files.giveUp(segments)
      if (removed.hasRejected) await removeRejected(batch)
      nudge()
    },
    async removeSite(site) {
      const removed = await deleteSite(driver, site)
      if (!removed) return false
      files.giveUp(removed.segments)
      for (const batch of removed.rejected) await removeRejected(batch)
      return true
    },
    async rejectedPath(site, batch) {
      const { hasRejected } = await requireBatch(driver, site, batch)
      return hasRejected ? rejectedPath(batch) : null
    },
    readWindow: (site, window = {}) =>
      files.reading(async () => {
        await requireSite(driver, site)
        const { source, withOverruled, isSorted, batches } = await windowWithBatches(
          driver,
          files,
          site,
          window,
        )
        const nothing: ReadWindow = { path: null, rows: 0, channels: [], overruled: 0, batches }
        if (source === undefined) return nothing
        const path = join(window.folder ?? tempFolder, `${newId()}.parquet`)
        try {
          return await scans.withConnection(async (connection) => {
            const order = isSorted ? '' : 'ORDER BY turbine, time'
            const query = `SELECT * EXCLUDE (batch_seq) FROM ${source} ${order}`
            const rows = await writeParquet(connection, query, path)
            if (rows === 0) {
              await rm(path, { force: true })
              return nothing
            }
            const all =
              withOverruled &&
              (await connection.records(`SELECT count(*) AS row_count FROM ${withOverruled}`))
            const overruled = all ? (all[0]!['row_count'] as number) - rows : 0
            const columns = await connection.records(`DESCRIBE SELECT * EXCLUDE (batch_seq) FROM ${source}`)
            const names = columns.map((column) => column['column_name'] as string)
            const channels = names.filter((name) => name !== 'turbine' && name !== 'time')
            return { path, rows, channels, overruled, batches }
          })
        } catch (error) {
          await rm(path, { force: true })
          throw asStorageFull(error)
        }
      }),
    rows: (site, window = {}) =>
      files.reading(async () => {
        await requireSite(driver, site)
        const { source } = await winningRows(driver, files, site, window)
        if (source === undefined) return []
        return scans.withConnection((connection) =>
          rowsOf(connection, `(SELECT * EXCLUDE (batch_seq) FROM ${source})`),
        )
      }),
    days: (site, turbine, window = {}) =>
      files.reading(async () => {
        await requireSite(driver, site)
        const { source } = await winningRows(driver, files, site, { ...window, turbines: [turbine] })
        if (source === undefined) return []
        const rows = await scans.withConnection((connection) =>
          connection.records(
            `SELECT time - (time % 86400000 + 86400000) % 86400000 AS day_ms, count(*) AS row_count,
               min(time) AS first_ms, max(time) AS last_ms
             FROM ${source} GROUP BY 1 ORDER BY 1`,
          ),
        )
        return rows.map((row) => ({
          dayMs: row['day_ms'] as number,
          rows: row['row_count'] as number,
          firstMs: row['first_ms'] as number,
          lastMs: row['last_ms'] as number,
        }))
      }),
    async extents(site) {
      await requireSite(driver, site)
      const rows = await driver.query(
        `SELECT turbine, min(first_ms) AS first_ms, max(last_ms) AS last_ms FROM batch_parts WHERE site = $1
         GROUP BY turbine ORDER BY turbine NULLS LAST`,
        [site],
      )
      return rows.map((row) => ({
        turbine: row['turbine'] as string,
        firstMs: row['first_ms'] as number,
        lastMs: row['last_ms'] as number,
      }))
    },
    compact: runCompaction,
    verify: () =>
      files.reading(async () => {
        const rows = await driver.query('SELECT segment, checksum FROM segments ORDER BY segment NULLS LAST')
        const damaged: string[] = []
        for (const row of rows) {
          const segment = row['segment'] as string
          const found = await fileChecksum(files.path(segment)).catch(() => undefined)
          if (found !== row['checksum']) damaged.push(segment)
        }
        return damaged
      }),
    async close() {
      isClosing = true
      await compacting.catch(() => 0)
      await files.settled()
    },
  }
}

/** Asked again where a batch was deleted between the two questions. */
async function windowWithBatches(
  driver: CatalogueDriver,
  files: SegmentFiles,
  site: string,
  window: LogWindow,
): Promise<WinningRows & { batches: StoredBatch[] }> {
  for (;;) {
    const winning = await winningRows(driver, files, site, window)
    const batches = await batchesOf(driver, site, winning.seqs)
    if (batches.length === winning.seqs.length) return { ...winning, batches }
  }
}

/**
 * A commit that failed on a full disk may be on disk all the same: the catalogue is asked before files are removed.
 * @throws the error of the write when the batch is not there; Unsettled around it when nobody can say
 */
async function whetherKept(
  driver: CatalogueDriver,
  added: { batch: string; site: string; contentKey: string },
  error: unknown,
): Promise<{ batch: StoredBatch; isNew: boolean }> {
  if (error instanceof InputError && error.code === 'SITE_NOT_FOUND') throw error
  const kept = await findByContent(driver, added.site, added.contentKey).catch(() => {
    throw new Unsettled(error)
  })
  if (!kept) throw error
  return { batch: kept, isNew: kept.batch === added.batch }
}

class Unsettled extends Error {
  constructor(cause: unknown) {
    super('the catalogue does not answer', { cause })
  }
}
