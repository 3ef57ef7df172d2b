import { mkdir, open, rm } from 'node:fs/promises'
import { join } from 'node:path'
import { InputError } from '../errors.ts'
import type { Connection } from '../duck/index.ts'
import type { Receipt } from '../sheet/index.ts'
import { alikeForm, AlikeScanner, beginsSorted, NotAlike, type AlikeForm } from './alike-lines.ts'
import { sniffEncoding, toUtf8 } from './clean-text.ts'
import type { LogLimits, LogParts, LogReading, LogSource, StagedLog } from './contract.ts'
import type { MappedColumn } from './mapped-column.ts'
import { buildReceipt, refuseUnfit, type SourceAccount } from './log-account.ts'
import { readableSource } from './parquet-source.ts'
import { planSource, type SourcePlan } from './plan-source.ts'
import { Rejects } from './rejects.ts'
import type { PostState, ScanCounts } from './post-state.ts'
import { NeedsSafeDelimiter, RowScanner } from './row-scanner.ts'
import { linkedSource, scanAlike } from './scan-alike.ts'
import { sentLines } from './sent-lines.ts'
import { sourceBytes } from './source-bytes.ts'
import { cellsSql, rowsSql } from './clean-file.ts'
import { commonestStep } from './row-clock.ts'
import { findGrid, gridPointSql, otherIntervals, type TimeGrid } from './time-grid.ts'
import { countCells, intervals, stageRows, type Intervals, type NamedCleanFile } from './stage-rows.ts'
import { textLines } from './text-lines.ts'
import { zoneTable } from './zone-table.ts'

/** Share of rows that must stand near the grid for any to be moved. */
const SNAP_SHARE = 0.95

/**
 * Reads logs into one sorted Parquet file of clean rows, and accounts for every line and cell.
 *
 * Of two rows with the same turbine and time the last one in the order of sources and lines wins. Memory does not grow with the
 * length of the logs, but with the number of turbines.
 *
 * @param sources  one or more logs; each has a header of its own.
 * @throws InputError LOG_* as the error table has them, BAD_OPTION for an unknown time zone
 */
export async function stageLog(
  sources: readonly LogSource[],
  reading: LogReading,
  parts: LogParts,
): Promise<StagedLog> {
  if (sources.length === 0) throw new InputError('LOG_EMPTY', 'sources: expected at least one log, got none')
  await mkdir(parts.folder, { recursive: true })
  const working: string[] = []
  try {
    const plans: SourcePlan[] = []
    for (const [i, source] of sources.entries()) {
      plans.push(await planSource(await readableSource(source, i, parts, working), reading, parts.limits))
    }
    // Each further attempt knows one log more for what it is.
    for (;;) {
      const attempt = await scanAll(plans, reading, parts, working)
      if (attempt === null) continue
      try {
        return await parts.scans.withConnection((c) => stage(c, attempt, reading, parts))
      } catch (error) {
        if (!(error instanceof NotAlike)) throw error
        for (const [i, plan] of plans.entries()) plans[i] = { ...plan, mayBeAlike: false }
      }
    }
  } finally {
    for (const path of working) await rm(path, { force: true })
  }
}

interface Scanned {
  readonly post: PostState
  readonly accounts: readonly SourceAccount[]
  readonly files: readonly NamedCleanFile[]
  /** Rows written while the log was looked at; null when that was not to be tried. */
  readonly copied: number | null
}

/** @returns null when a source turned out to be another than its plan says: the plan says so now, and all is read again. */
async function scanAll(
  plans: SourcePlan[],
  reading: LogReading,
  parts: LogParts,
  working: string[],
): Promise<Scanned | null> {
  const rejects = new Rejects(join(parts.folder, 'rejected.csv'))
  const post: PostState = { tracks: new Map(), rejects, sorted: true, mayRepeat: false, last: null, rows: 0 }
  const zone = zoneTable(reading.timezone ?? reading.defaultTimezone ?? 'UTC')
  const accounts: SourceAccount[] = []
  const files: NamedCleanFile[] = []
  let copied: number | null = null
  for (const [i, plan] of plans.entries()) {
    const scan = { ...plan.scan, zone, limits: parts.limits }
    const rejectedBefore = rejects.rows
    try {
      const form = plan.mayBeAlike ? alikeForm(plan, zone) : null
      const path = form
        ? await linkedSource(plan.source, i, parts.folder, working)
        : join(parts.folder, `clean-${i}.csv`)
      if (path === null) throw new NotAlike()
      if (!working.includes(path)) working.push(path)
      let counts: ScanCounts
      let sha256: string
      if (form) {
        const isCopied = plans.length === 1 && !statesEnd(reading) && beginsSorted(plan)
        const file = cleanFile(plan, path, parts.limits, plan.dialect.delimiter, form)
        const scanned = await scanAlike(new AlikeScanner(form, scan, post), file, isCopied, plan, parts)
        ;({ counts, sha256, copied } = scanned)
        files.push(file)
      } else {
        const scanner = new RowScanner(scan, post)
        sha256 = await scanSource(plan, scanner, path, parts.limits)
        counts = scanner
        files.push(cleanFile(plan, path, parts.limits, scanner.outDelimiter, null))
      }
      const rejectedInScan = rejects.rows - rejectedBefore
      accounts.push({ plan, scanner: counts, sha256, rejectedInScan, rows: counts.rows })
    } catch (error) {
      await rejects.close()
      await rm(join(parts.folder, 'rejected.csv'), { force: true })
      if (error instanceof NotAlike) plans[i] = { ...plan, mayBeAlike: false }
      else if (error instanceof NeedsSafeDelimiter) plans[i] = { ...plan, scan: { ...plan.scan, safe: true } }
      else throw error
      return null
    }
    // Rows that SQL makes of lines are sorted and counted there.
    if (plan.map.series) post.sorted = !(post.mayRepeat = true)
  }
  return { post, accounts, files, copied }
}

const statesEnd = (reading: LogReading) => (reading.stamp ?? reading.defaultStamp) === 'end'

function cleanFile(
  plan: SourcePlan,
  path: string,
  limits: LogLimits,
  delimiter: string,
  alike: AlikeForm | null,
): NamedCleanFile {
  const { series } = plan.map
  return {
    name: plan.source.name,
    path,
    alike,
    delimiter,
    kept: plan.scan.kept,
    sentinels: new Map(),
    sentLines: () => sentLines(plan.source, limits, sniffEncoding(plan.firstBytes)),
    shape: series?.shape ?? null,
    decimalComma: plan.dialect.decimalComma,
    maxLineBytes: limits.maxLineBytes,
    turbine: series ? 0 : plan.scan.turbine,
    turbineName: plan.scan.turbineName,
    channels: plan.map.channels,
  }
}

async function scanSource(
  plan: SourcePlan,
  scanner: RowScanner,
  path: string,
  limits: LogLimits,
): Promise<string> {
  const bytes = await sourceBytes(plan.source, limits)
  const file = await open(path, 'w')
  try {
    const text = toUtf8(bytes.chunks, sniffEncoding(plan.firstBytes))
    for await (const slab of textLines(plan.source.name, text, limits.maxLineBytes, scanner)) {
      await scanner.write(slab, file)
    }
  } finally {
    await file.close()
  }
  return bytes.sha256()
}

async function stage(
  connection: Connection,
  scanned: Scanned,
  reading: LogReading,
  parts: LogParts,
): Promise<StagedLog> {
  const { post, accounts, files, copied } = scanned
  const warnings: string[] = []
  try {
    refuseUnfit(accounts, post)
    for (const [i, file] of files.entries())
      if (file.shape) await countMadeRows(connection, accounts[i]!, file, post)
    const channels = mergedChannels(files.map((file) => file.channels))
    const found = await intervals(connection, files, post)
    const snap = await findSnap(connection, files, found, post)
    if (snap)
      warnings.push(
        `time: ${snap.moved} stamps stand beside the grid of ${snap.grid.intervalMs / 1000} s and were moved to it, by ${snap.grid.toleranceMs / 1000} s at most`,
      )
    const { byTurbine, overall, steps } = snap ? onGrid(found, snap.grid) : found
    const mixed = overall === null ? null : otherIntervals(steps, overall, byTurbine)
    if (mixed !== null) warnings.push(mixed)
    const shiftMs = new Map<string, number>()
    if (statesEnd(reading)) {
      if (overall === null)
        warnings.push('stamp: the log has no two rows of one turbine; its times are kept as they are')
      for (const name of new Set([...post.tracks.keys(), ...byTurbine.keys()])) {
        shiftMs.set(name, byTurbine.get(name) ?? overall ?? 0)
      }
    }
    const staged = await stageRows(connection, {
      files,
      channels,
      post,
      shiftMs,
      grid: snap?.grid ?? null,
      rejects: post.rejects,
      folder: parts.folder,
      copied,
    })
    const cells = []
    for (const [i, file] of staged.files.entries()) {
      const isPlain = files.length === 1 && accounts[i]!.scanner.rows === staged.accepted
      const doubtful = isPlain ? lossyColumns(accounts[i]!, staged.present) : file.channels
      cells.push(await countCells(connection, { ...file, channels: doubtful }))
    }
    const receipt: Receipt = buildReceipt({
      accounts,
      post,
      staged,
      cells,
      overall,
      reading,
      warnings,
      channels,
    })
    const rejectedPath = await post.rejects.close()
    return { path: staged.path, rejectedPath, receipt, channels }
  } catch (error) {
    await post.rejects.close()
    await rm(join(parts.folder, 'rejected.csv'), { force: true })
    await rm(join(parts.folder, 'staged.parquet'), { force: true })
    throw error
  }
}

/** How far jittering stamps are moved; null when they keep to their distances, or stand too far from any grid. */
async function findSnap(
  connection: Connection,
  files: readonly NamedCleanFile[],
  found: Intervals,
  post: PostState,
): Promise<{ grid: TimeGrid; moved: number } | null> {
  const grid = findGrid(found.steps)
  if (!grid) return null
  const point = gridPointSql('time', grid)
  const rows = files.map((file, i) => rowsSql(file, i, [], false)).join(' UNION ALL ')
  const [counts] = await connection.records(
    `SELECT count(*) FILTER (abs(time - ${point}) <= ${grid.toleranceMs}) AS near, count(*) FILTER (time = ${point}) AS exact FROM (${rows})`,
  )
  const near = Number(counts!['near'])
  if (!(near >= SNAP_SHARE * post.rows)) return null
  post.mayRepeat = true
  post.sorted = false
  return { grid, moved: near - Number(counts!['exact']) }
}

/** Intervals after the stamps were moved: steps near a multiple of the grid are that multiple. */
function onGrid(found: Intervals, grid: TimeGrid): Intervals {
  const toGrid = (ms: number) => {
    const multiple = Math.max(1, Math.round(ms / grid.intervalMs)) * grid.intervalMs
    return Math.abs(ms - multiple) <= 2 * grid.toleranceMs ? multiple : ms
  }
  const steps = new Map<number, number>()
  for (const [ms, n] of found.steps) steps.set(toGrid(ms), (steps.get(toGrid(ms)) ?? 0) + n)
  const byTurbine = new Map([...found.byTurbine].map(([name, ms]) => [name, toGrid(ms)]))
  return { steps, byTurbine, overall: commonestStep(steps) }
}

/** Where a line is not one row, the account is of the rows that were made of the lines. */
async function countMadeRows(
  connection: Connection,
  account: SourceAccount,
  file: NamedCleanFile,
  post: PostState,
): Promise<void> {
  const [made] = await connection.records(`SELECT count(*) AS n FROM ${cellsSql(file)}`)
  post.rows += Number(made!['n']) - account.rows
  account.rows = Number(made!['n'])
}

/** Columns in which some cell with text has not become a value. */
function lossyColumns(
  { plan, scanner }: SourceAccount,
  present: ReadonlyMap<string, number>,
): readonly MappedColumn[] {
  return plan.map.channels.filter(
    (column: MappedColumn) =>
      scanner.rows - scanner.emptyCells[column.index]! !== present.get(column.takenFor!),
  )
}

/** Channels of all files in the order of the first that has them. */
function mergedChannels(lists: readonly (readonly MappedColumn[])[]): string[] {
  return [...new Set(lists.flatMap((list) => list.map((column) => column.takenFor!)))]
}
