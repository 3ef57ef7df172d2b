import { Value } from 'typebox/value'
import { InputError } from '../../errors.ts'
import { TurbineSetup, type Receipt, type SiteFile } from '../../sheet/index.ts'
import type { CatalogueDriver, Row, Transaction } from '../catalogue/driver.ts'
import { readCursor, writeCursor } from '../cursor.ts'
import { requireSite, writeSite } from '../sites.ts'
import type { BatchPart, WrittenSegment } from './write-segments.ts'

/** A log that was taken in. */
export interface StoredBatch {
  readonly batch: string
  readonly site: string
  /** A batch with a higher number wins over a lower one at the same turbine and time. */
  readonly seq: number
  readonly createdMs: number
  /** How the log was read, with the defaults of the site at that time. */
  readonly reading: Record<string, unknown>
  readonly receipt: Receipt
  /** Whether there is a file of rejected rows. */
  readonly hasRejected: boolean
}

export interface NewBatch {
  readonly batch: string
  readonly site: string
  readonly seq: number
  readonly contentKey: string
  readonly reading: Record<string, unknown>
  readonly receipt: Receipt
  readonly hasRejected: boolean
  readonly createdMs: number
}

export async function nextSeq(driver: CatalogueDriver): Promise<number> {
  const rows = await driver.write((transaction) =>
    transaction.query(
      `INSERT INTO counters (name, value) VALUES ('batch_seq', 1)
       ON CONFLICT (name) DO UPDATE SET value = counters.value + 1 RETURNING value`,
    ),
  )
  return rows[0]!['value'] as number
}

/**
 * Makes a batch, its segments and turbines that the site did not know visible, all at once.
 * @returns the batch as kept; or the one that has the same content already, then nothing is changed
 * @throws InputError SITE_NOT_FOUND, LOG_COLUMN_MAP for more turbines than a site can have
 */
export async function insertBatch(
  driver: CatalogueDriver,
  added: NewBatch,
  segments: readonly WrittenSegment[],
  parts: readonly BatchPart[],
): Promise<{ batch: StoredBatch; isNew: boolean }> {
  return driver.write(async (transaction) => {
    const file = await requireSite(transaction, added.site)
    const same = await findByContent(transaction, added.site, added.contentKey)
    if (same) return { batch: same, isNew: false }
    const receipt = await addTurbines(transaction, added, file, parts)
    await transaction.query(
      `INSERT INTO batches (batch, site, seq, content_key, reading, receipt, has_rejected, created_ms)
       VALUES ($1, $2, $3, $4, $5, $6, $7, $8)`,
      [
        added.batch,
        added.site,
        added.seq,
        added.contentKey,
        JSON.stringify(added.reading),
        JSON.stringify(receipt),
        added.hasRejected,
        added.createdMs,
      ],
    )
    for (const segment of segments) {
      await insertSegment(transaction, added.site, segment)
      await transaction.query(
        'INSERT INTO segment_batches (seq, month, segment, row_count) VALUES ($1, $2, $3, $4)',
        [added.seq, segment.month, segment.segment, segment.rows],
      )
    }
    await insertParts(transaction, added, parts)
    const { batch, site, seq, reading, hasRejected, createdMs } = added
    return { batch: { batch, site, seq, reading, receipt, hasRejected, createdMs }, isNew: true }
  })
}

/** Rows of one INSERT: a year of a large farm has thousands of parts. */
const PARTS_AT_ONCE = 100

async function insertParts(
  transaction: Transaction,
  { site, seq }: NewBatch,
  parts: readonly BatchPart[],
): Promise<void> {
  for (let start = 0; start < parts.length; start += PARTS_AT_ONCE) {
    const some = parts.slice(start, start + PARTS_AT_ONCE)
    const rows = some.map((_, i) => `($1, $2, ${[3, 4, 5, 6, 7].map((k) => `$${5 * i + k}`).join(', ')})`)
    await transaction.query(
      `INSERT INTO batch_parts (seq, site, month, turbine, first_ms, last_ms, row_count)
       VALUES ${rows.join(', ')}`,
      [
        seq,
        site,
        ...some.flatMap((part) => [part.month, part.turbine, part.firstMs, part.lastMs, part.rows]),
      ],
    )
  }
}

export async function insertSegment(
  transaction: Transaction,
  site: string,
  segment: WrittenSegment,
): Promise<void> {
  await transaction.query(
    `INSERT INTO segments (segment, site, month, row_count, dead_rows, byte_count, checksum, only_seq)
     VALUES ($1, $2, $3, $4, 0, $5, $6, $7)`,
    [segment.segment, site, segment.month, segment.rows, segment.bytes, segment.checksum, segment.onlySeq],
  )
}

/** As many as a site file may name. */
const MAX_TURBINES = 5000

async function addTurbines(
  transaction: Transaction,
  added: NewBatch,
  file: SiteFile,
  parts: readonly BatchPart[],
): Promise<Receipt> {
  const known = new Set((file.turbines ?? []).map(({ turbine }) => turbine))
  const unknown = [...new Set(parts.map(({ turbine }) => turbine))].filter((turbine) => !known.has(turbine))
  if (unknown.length === 0) return added.receipt
  const fitting = unknown.filter((turbine) => Value.Check(TurbineSetup, { turbine }))
  const turbines = [...(file.turbines ?? []), ...fitting.map((turbine) => ({ turbine }))]
  if (turbines.length > MAX_TURBINES) {
    throw new InputError(
      'LOG_COLUMN_MAP',
      `turbine: expected at most ${MAX_TURBINES} turbines at a site, got ${turbines.length}; is this the column of turbines?`,
    )
  }
  if (fitting.length > 0) await writeSite(transaction, added.site, { ...file, turbines }, added.createdMs)
  const warnings = unknown.map((turbine) =>
    fitting.includes(turbine)
      ? `turbine "${turbine}" was not set up at this site: it was added without rated power and position`
      : `turbine "${turbine.slice(0, 100)}" is not set up at this site and cannot be: expected a name of 1 to 100 characters without "/" and control characters; its rows are kept`,
  )
  return { ...added.receipt, warnings: [...added.receipt.warnings, ...warnings] }
}

const COLUMNS = 'batch, site, seq, reading, receipt, has_rejected, created_ms'

export async function findByContent(
  source: Pick<Transaction, 'query'>,
  site: string,
  contentKey: string,
): Promise<StoredBatch | undefined> {
  const rows = await source.query(`SELECT ${COLUMNS} FROM batches WHERE site = $1 AND content_key = $2`, [
    site,
    contentKey,
  ])
  return rows[0] && toBatch(rows[0])
}

/** @throws InputError SITE_NOT_FOUND, BATCH_NOT_FOUND */
export async function requireBatch(
  source: Pick<Transaction, 'query'>,
  site: string,
  batch: string,
): Promise<StoredBatch> {
  const rows = await source.query(`SELECT ${COLUMNS} FROM batches WHERE site = $1 AND batch = $2`, [
    site,
    batch,
  ])
  if (rows[0]) return toBatch(rows[0])
  await requireSite(source, site)
  throw new InputError('BATCH_NOT_FOUND', `log: expected one of site "${site}", got "${batch.slice(0, 100)}"`)
}

/** Numbers apart by no more than this are asked for together: most of those between are of the same site, or gone. */
const MOST_GAP = 64

/**
 * The batches of these numbers that are there, earliest first.
 * @param seqs  rising; numbers of batches of the site
 */
export async function batchesOf(
  source: Pick<Transaction, 'query'>,
  site: string,
  seqs: readonly number[],
): Promise<StoredBatch[]> {
  if (seqs.length === 0) return []
  // Ten thousand numbers, each bound by itself, took five times as long as their range.
  const bounds: number[] = []
  for (const [i, seq] of seqs.entries()) {
    if (i === 0) bounds.push(seq)
    else if (seq - seqs[i - 1]! > MOST_GAP) bounds.push(seqs[i - 1]!, seq)
  }
  bounds.push(seqs.at(-1)!)
  const ranges = Array.from(
    { length: bounds.length / 2 },
    (_, i) => `seq BETWEEN $${2 * i + 2} AND $${2 * i + 3}`,
  )
  const rows = await source.query(
    `SELECT ${COLUMNS} FROM batches WHERE site = $1 AND (${ranges.join(' OR ')}) ORDER BY seq NULLS LAST`,
    [site, ...bounds],
  )
  const wanted = new Set(seqs)
  return rows.filter((row) => wanted.has(row['seq'] as number)).map(toBatch)
}

/** Newest first. @throws InputError SITE_NOT_FOUND, BAD_REQUEST */
export async function listBatches(
  driver: CatalogueDriver,
  site: string,
  { after, limit }: { after?: string; limit: number },
): Promise<{ batches: StoredBatch[]; next: string | null }> {
  if (!(Number.isInteger(limit) && limit >= 1 && limit <= 1000)) {
    throw new InputError('BAD_REQUEST', `limit: expected a whole number from 1 to 1000, got ${limit}`)
  }
  await requireSite(driver, site)
  const cursor = after === undefined ? undefined : readCursor(after)
  const rows = await driver.query(
    `SELECT ${COLUMNS} FROM batches WHERE site = $1 ${cursor ? 'AND seq < $3' : ''}
     ORDER BY seq DESC NULLS LAST LIMIT $2`,
    cursor ? [site, limit + 1, cursor.ms] : [site, limit + 1],
  )
  const batches = rows.slice(0, limit).map(toBatch)
  const last = batches.at(-1)
  return {
    batches,
    next: last && rows.length > limit ? writeCursor({ ms: last.seq, id: last.batch }) : null,
  }
}

/**
 * Takes a batch out of sight. Segments that hold nothing else leave the catalogue; in the others its rows are dead
 * until compaction drops them.
 * @returns segments whose files can be given up
 * @throws InputError SITE_NOT_FOUND, BATCH_NOT_FOUND
 */
export async function deleteBatch(
  driver: CatalogueDriver,
  site: string,
  batch: string,
): Promise<{ removed: StoredBatch; segments: { segment: string; bytes: number }[] }> {
  return driver.write(async (transaction) => {
    const removed = await requireBatch(transaction, site, batch)
    await transaction.query('DELETE FROM batches WHERE batch = $1', [batch])
    await transaction.query('DELETE FROM batch_parts WHERE seq = $1', [removed.seq])
    const places = await transaction.query(
      'DELETE FROM segment_batches WHERE seq = $1 RETURNING segment, row_count',
      [removed.seq],
    )
    const segments: { segment: string; bytes: number }[] = []
    for (const place of places) {
      const segment = place['segment'] as string
      await transaction.query('UPDATE segments SET dead_rows = dead_rows + $2 WHERE segment = $1', [
        segment,
        place['row_count']!,
      ])
      const gone = await transaction.query(
        'DELETE FROM segments WHERE segment = $1 AND dead_rows = row_count RETURNING byte_count',
        [segment],
      )
      if (gone[0]) segments.push({ segment, bytes: gone[0]['byte_count'] as number })
    }
    return { removed, segments }
  })
}

/** Takes a site with all its logs out of sight; undefined when there is none. */
export async function deleteSite(
  driver: CatalogueDriver,
  site: string,
): Promise<{ rejected: string[]; segments: { segment: string; bytes: number }[] } | undefined> {
  return driver.write(async (transaction) => {
    const removed = await transaction.query('DELETE FROM sites WHERE site = $1 RETURNING site', [site])
    if (removed.length === 0) return undefined
    await transaction.query(
      'DELETE FROM segment_batches WHERE segment IN (SELECT segment FROM segments WHERE site = $1)',
      [site],
    )
    const segments = await transaction.query(
      'DELETE FROM segments WHERE site = $1 RETURNING segment, byte_count',
      [site],
    )
    await transaction.query('DELETE FROM batch_parts WHERE site = $1', [site])
    const batches = await transaction.query(
      'DELETE FROM batches WHERE site = $1 RETURNING batch, has_rejected',
      [site],
    )
    return {
      rejected: batches.filter((row) => row['has_rejected']).map((row) => row['batch'] as string),
      segments: segments.map((row) => ({
        segment: row['segment'] as string,
        bytes: row['byte_count'] as number,
      })),
    }
  })
}

function toBatch(row: Row): StoredBatch {
  return {
    batch: row['batch'] as string,
    site: row['site'] as string,
    seq: row['seq'] as number,
    createdMs: row['created_ms'] as number,
    reading: JSON.parse(row['reading'] as string) as Record<string, unknown>,
    receipt: JSON.parse(row['receipt'] as string) as Receipt,
    hasRejected: row['has_rejected'] as boolean,
  }
}
