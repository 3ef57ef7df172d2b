import { join } from 'node:path'
import {
  quoteIdentifier,
  quoteText,
  readColumns,
  streamColumns,
  writeParquet,
  type Connection,
} from '../duck/index.ts'
import { NotAlike } from './alike-lines.ts'
import { cellCountsSql, rowsSql, type CleanFile } from './clean-file.ts'
import type { Rejects } from './rejects.ts'
import { commonestStep, flushSteps } from './row-clock.ts'
import { findSentinels } from './sentinels.ts'
import type { SentLine } from './sent-lines.ts'
import type { PostState } from './post-state.ts'
import { snapSql, type TimeGrid } from './time-grid.ts'

export interface NamedCleanFile extends CleanFile {
  readonly name: string
  /** Reads the lines of the log again, as sent. */
  sentLines(): AsyncGenerator<SentLine>
}

/** What became of the cells of one number column. */
export interface CellCount {
  readonly filled: number
  readonly unreadable: number
  readonly outOfRange: number
  /** First cell that could not be read, and its line. */
  readonly example: string | null
  readonly exampleLine: number | null
  /** Cells above the highest value of the channel, and about how many different ones. */
  readonly above: number
  readonly aboveKinds: number
}

export interface StagedRows {
  readonly path: string
  /** The files with what was learnt from their rows. */
  readonly files: readonly NamedCleanFile[]
  readonly accepted: number
  readonly duplicate: number
  /** Per channel: cells that hold a value. */
  readonly present: ReadonlyMap<string, number>
  readonly turbines: readonly { turbine: string; rows: number; firstMs: number; lastMs: number }[]
}

export interface RowParts {
  readonly files: readonly NamedCleanFile[]
  readonly channels: readonly string[]
  readonly post: PostState
  /** Per turbine: subtracted from its times. */
  readonly shiftMs: ReadonlyMap<string, number>
  /** Stamps near this grid are moved to it; null: none is moved. */
  readonly grid: TimeGrid | null
  readonly rejects: Rejects
  readonly folder: string
  /** Rows that `copyRows` has written already; null when it was not asked. */
  readonly copied: number | null
}

const stagedPath = (folder: string) => join(folder, 'staged.parquet')

/**
 * Writes the rows of one file as they come, while they are still being looked at. When they prove to be sorted, without repetitions
 * and whole, `stageRows` takes this for the result.
 * @returns rows written
 */
export async function copyRows(
  connection: Connection,
  file: CleanFile,
  channels: readonly string[],
  folder: string,
): Promise<number> {
  const list = ['turbine', 'time', ...channels.map(quoteIdentifier)].join(', ')
  const query = `SELECT ${list} FROM (${rowsSql(file, 0, channels, false)})`
  return writeParquet(connection, query, stagedPath(folder), undefined, 'snappy')
}

/**
 * Writes the clean rows to one sorted Parquet file; rows without any value go to `rejects`.
 * @throws NotAlike when SQL finds other rows in a log than the scan
 */
export async function stageRows(connection: Connection, parts: RowParts): Promise<StagedRows> {
  const { channels, post, rejects } = parts
  const path = stagedPath(parts.folder)
  let files = parts.files
  let accepted = (await isAsCopied(connection, parts)) ? parts.copied! : await writeRows(connection, parts)
  const sentinels = await findSentinels(connection, path, files, channels)
  if (sentinels.size > 0) {
    files = files.map((file) => ({ ...file, sentinels }))
    accepted = await writeRows(connection, { ...parts, files })
  }
  let kept = accepted
  if (post.mayRepeat) {
    const [counted] = await connection.records(
      `SELECT count(*) AS n FROM ${rowsOf({ ...parts, files }, false)} WHERE ${hasValueSql(channels)}`,
    )
    kept = Number(counted!['n'])
  }
  const rejectedBefore = rejects.rows
  if (kept < post.rows) await rejectEmpty(connection, files, channels, rejects)
  if (files.some(({ alike }) => alike) && kept + rejects.rows - rejectedBefore !== post.rows)
    throw new NotAlike()

  const staged = `read_parquet(${quoteText(path)})`
  const counts = channels.map((channel, i) => `count(${quoteIdentifier(channel)}) AS n${i}`)
  const [present] = await connection.records(`SELECT ${counts.join(', ')} FROM ${staged}`)
  const turbines = await readColumns(
    connection,
    `(SELECT turbine, count(*) AS rows, min(time) AS first, max(time) AS last FROM ${staged} GROUP BY turbine)`,
    { turbine: 'text', rows: 'number', first: 'number', last: 'number' },
    { orderBy: 'turbine' },
  )
  return {
    path,
    files,
    accepted,
    duplicate: kept - accepted,
    present: new Map(channels.map((channel, i) => [channel, Number(present![`n${i}`])])),
    turbines: turbines.columns.turbine.map((turbine, i) => ({
      turbine: turbine!,
      rows: turbines.columns.rows[i]!,
      firstMs: turbines.columns.first[i]!,
      lastMs: turbines.columns.last[i]!,
    })),
  }
}

/** Whether what `copyRows` wrote is the result: nothing to be sorted, moved or left out. */
async function isAsCopied(connection: Connection, parts: RowParts): Promise<boolean> {
  const { copied, post, channels } = parts
  if (copied === null || !post.sorted || post.mayRepeat || parts.grid || parts.shiftMs.size > 0) return false
  if (copied !== post.rows) throw new NotAlike()
  const [counted] = await connection.records(
    `SELECT count(*) AS n FROM read_parquet(${quoteText(stagedPath(parts.folder))}) WHERE NOT ${hasValueSql(channels)}`,
  )
  return Number(counted!['n']) === 0
}

async function writeRows(connection: Connection, parts: RowParts): Promise<number> {
  const { channels, post } = parts
  const list = channels.map(quoteIdentifier).join(', ')
  const rows = rowsOf(parts, post.mayRepeat)
  const query = [
    `SELECT turbine, time - ${shiftSql(parts.shiftMs)} AS time, ${list} FROM ${rows} WHERE ${hasValueSql(channels)}`,
    post.mayRepeat
      ? 'QUALIFY row_number() OVER (PARTITION BY turbine, time ORDER BY src DESC, line DESC) = 1'
      : '',
    post.sorted ? '' : 'ORDER BY turbine, time',
  ].join(' ')
  return writeParquet(connection, query, stagedPath(parts.folder), undefined, 'snappy')
}

function rowsOf({ files, channels, grid }: RowParts, numbered: boolean): string {
  const asRead = `(${files.map((file, i) => rowsSql(file, i, channels, numbered)).join(' UNION ALL ')})`
  return grid ? `(SELECT * REPLACE (${snapSql('time', grid)} AS time) FROM ${asRead})` : asRead
}

const hasValueSql = (channels: readonly string[]) =>
  `(${channels.map((channel) => `${quoteIdentifier(channel)} IS NOT NULL`).join(' OR ')})`

/** Looks up the rows without any value: only asked for when the counts disagree. */
async function rejectEmpty(
  connection: Connection,
  files: readonly NamedCleanFile[],
  channels: readonly string[],
  rejects: Rejects,
): Promise<void> {
  for (const [i, file] of files.entries()) {
    const own = channels.filter((channel) => file.channels.some((column) => column.takenFor === channel))
    const isEmpty = own.map((channel) => `${quoteIdentifier(channel)} IS NULL`).join(' AND ')
    const source = `(SELECT DISTINCT line, count(*) OVER (PARTITION BY line) AS rows FROM (${rowsSql(file, i, own)}) WHERE ${isEmpty})`
    const sent = file.sentLines()
    try {
      for await (const chunk of streamColumns(
        connection,
        source,
        { line: 'number', rows: 'number' },
        { orderBy: 'line' },
      )) {
        for (const [k, line] of chunk.columns.line.entries()) {
          const text = await lineAt(sent, line)
          // A line of a wide log may hold several empty rows.
          for (let n = chunk.columns.rows[k]!; n > 0; n--) rejects.add(file.name, line, 'no-values', text)
        }
        await rejects.flush()
      }
    } finally {
      await sent.return(undefined)
    }
  }
}

/** The text of a line as sent; lines are asked for in ascending order. */
async function lineAt(sent: AsyncGenerator<SentLine>, line: number): Promise<string> {
  for (;;) {
    const next = await sent.next()
    if (next.done) return ''
    if (next.value.line === line) return next.value.text
  }
}

/** Counts of unreadable cells and those outside limits, by channel; a second reading of the file. */
export async function countCells(connection: Connection, file: CleanFile): Promise<Map<string, CellCount>> {
  const sql = cellCountsSql(file)
  const counts = new Map<string, CellCount>()
  if (sql === '') return counts
  const [record] = await connection.records(sql)
  const numbers = file.channels.filter((column) => column.unit !== null)
  numbers.forEach((column, i) => {
    const number = (key: string) => Number(record![`${key}${i}`] ?? 0)
    const example = record![`example${i}`]
    counts.set(column.takenFor!, {
      filled: number('filled'),
      unreadable: number('unreadable'),
      outOfRange: number('outside'),
      example: typeof example === 'string' ? example : null,
      exampleLine: example === null ? null : number('exampleLine'),
      above: number('above'),
      aboveKinds: number('aboveKinds'),
    })
  })
  return counts
}

export interface Intervals {
  readonly byTurbine: ReadonlyMap<string, number>
  /** The commonest step of all, ms; null without any. */
  readonly overall: number | null
  /** Step, ms -> how often. */
  readonly steps: ReadonlyMap<number, number>
}

/** Commonest step per turbine, ms, and that of all; from the scan when times only rose, else from the sorted rows. */
export async function intervals(
  connection: Connection,
  files: readonly CleanFile[],
  post: PostState,
): Promise<Intervals> {
  const byName = new Map<string, Map<number, number>>()
  if (!post.mayRepeat) {
    for (const [name, track] of post.tracks) {
      flushSteps(track)
      byName.set(name, track.steps)
    }
  } else {
    const rows = files.map((file, i) => rowsSql(file, i, [], false)).join(' UNION ALL ')
    const steps = `SELECT turbine, time - lag(time) OVER (PARTITION BY turbine ORDER BY time) AS step
      FROM (SELECT DISTINCT turbine, time FROM (${rows}))`
    const { columns } = await readColumns(
      connection,
      `(SELECT turbine, step, count(*) AS n FROM (${steps}) WHERE step > 0 GROUP BY turbine, step)`,
      { turbine: 'text', step: 'number', n: 'number' },
      { orderBy: 'turbine, step' },
    )
    columns.turbine.forEach((turbine, i) => {
      const own = byName.get(turbine!) ?? new Map<number, number>()
      own.set(columns.step[i]!, columns.n[i]!)
      byName.set(turbine!, own)
    })
  }
  const all = new Map<number, number>()
  const byTurbine = new Map<string, number>()
  for (const [name, steps] of byName) {
    const step = commonestStep(steps)
    if (step !== null) byTurbine.set(name, step)
    for (const [ms, n] of steps) all.set(ms, (all.get(ms) ?? 0) + n)
  }
  return { byTurbine, overall: commonestStep(all), steps: all }
}

function shiftSql(shiftMs: ReadonlyMap<string, number>): string {
  const byShift = new Map<number, string[]>()
  for (const [turbine, ms] of shiftMs) byShift.set(ms, [...(byShift.get(ms) ?? []), turbine])
  const shifts = [...byShift.keys()]
  if (shifts.length === 0) return '0'
  if (shifts.length === 1) return String(shifts[0]!)
  const cases = shifts.map(
    (ms) => `WHEN turbine IN (${byShift.get(ms)!.map(quoteText).join(', ')}) THEN ${ms}`,
  )
  return `CASE ${cases.join(' ')} ELSE 0 END`
}
