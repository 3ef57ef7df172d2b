import { mkdtemp, rm, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { quoteText, type SqlCell } from '../duck/index.ts'
import { InputError } from '../errors.ts'
import type { Receipt } from '../sheet/index.ts'
import { sniffEncoding } from './clean-text.ts'
import type { LogParts, LogReading, LogSource } from './contract.ts'
import { readableSource } from './parquet-source.ts'
import { firstBytes, planSource } from './plan-source.ts'
import { stageLog } from './stage-log.ts'

/** How one log would be read. */
export interface LogDescription {
  readonly name: string
  readonly encoding: string
  readonly form: string | null
  readonly delimiter: string | null
  readonly decimalComma: boolean | null
  /** Line number of the header, 1 = first; null without one. */
  readonly headerLine: number | null
  readonly timeFormat: string | null
  /** Zone of stamps without an offset. */
  readonly timezone: string
  readonly stamp: 'begin' | 'end'
  readonly intervalS: number | null
  readonly columns: Receipt['columns']
  /** First rows as understood: time in ISO 8601, canonical units. */
  readonly firstRows: readonly Record<string, SqlCell>[]
  /** Rows of the beginning that would be rejected. */
  readonly rejectedByReason: Receipt['rejectedByReason']
  /** Channels that the scoring wants and the log lacks. */
  readonly missing: readonly string[]
  readonly warnings: readonly string[]
  /** What would stop the reading: the error that it would answer. */
  readonly problem: { readonly code: string; readonly message: string } | null
}

const WANTED = ['wind_speed', 'vane', 'power', 'nacelle_position', 'air_temperature']
const FIRST_ROWS = 5

/**
 * Says how a log would be read, from its beginning (256 KiB), and stores nothing. Mistakes of the log are part of the answer.
 * @throws InputError LOG_NOT_FOUND, LOG_CORRUPT, LOG_EMPTY: there is nothing to describe
 */
export async function describeLog(
  source: LogSource,
  reading: LogReading,
  parts: LogParts,
): Promise<LogDescription> {
  const folder = await mkdtemp(join(parts.folder, 'describe-'))
  const working: string[] = []
  try {
    const inFolder = { ...parts, folder }
    const readable = await readableSource(source, 0, inFolder, working)
    const { bytes, complete } = await firstBytes(readable, parts.limits)
    const beginning = { name: source.name, path: join(folder, 'beginning') }
    await writeFile(beginning.path, complete ? bytes : wholeLines(bytes))
    const base = {
      name: source.name,
      encoding: sniffEncoding(bytes).encoding,
      timezone: reading.timezone ?? reading.defaultTimezone ?? 'UTC',
      stamp: reading.stamp ?? reading.defaultStamp ?? 'begin',
    }
    let known: Partial<LogDescription> = {}
    try {
      const plan = await planSource(beginning, reading, parts.limits)
      known = {
        form: plan.dialect.form,
        delimiter: plan.dialect.form === 'json' ? null : plan.dialect.delimiter,
        decimalComma: plan.dialect.decimalComma,
        headerLine: plan.dialect.headerLine || null,
        timeFormat: plan.timeFormat,
        columns: plan.map.columns.map((column) => ({
          column: column.name,
          takenFor: column.takenFor,
          unit: column.unitText,
          why: column.why,
          unreadable: 0,
          outOfRange: 0,
          missing: 0,
        })),
        missing: WANTED.filter((channel) => !plan.map.channels.some(({ takenFor }) => takenFor === channel)),
      }
      const log = await stageLog([beginning], reading, inFolder)
      known = {
        ...known,
        intervalS: log.receipt.intervalS,
        columns: log.receipt.columns,
        rejectedByReason: log.receipt.rejectedByReason,
        warnings: log.receipt.warnings,
        firstRows: await firstRows(log.path, parts),
      }
      return { ...NOTHING, ...base, ...known, problem: null }
    } catch (error) {
      if (!(error instanceof InputError)) throw error
      return { ...NOTHING, ...base, ...known, problem: { code: error.code, message: error.message } }
    }
  } finally {
    await rm(folder, { recursive: true, force: true })
  }
}

const NOTHING = {
  form: null,
  delimiter: null,
  decimalComma: null,
  headerLine: null,
  timeFormat: null,
  intervalS: null,
  columns: [],
  firstRows: [],
  rejectedByReason: [],
  missing: WANTED,
  warnings: [],
}

/** The beginning without the line that it cuts: up to the last line end, whichever kind. */
function wholeLines(bytes: Buffer): Buffer {
  const end = Math.max(bytes.lastIndexOf(10), bytes.lastIndexOf(13))
  if (end < 0) return bytes
  // In UTF-16 the zero byte of the line end stands before or behind it.
  return bytes.subarray(0, sniffEncoding(bytes).encoding === 'utf-16le' ? end + 2 : end + 1)
}

async function firstRows(path: string, parts: LogParts): Promise<Record<string, SqlCell>[]> {
  const rows = await parts.scans.withConnection((connection) =>
    connection.records(`SELECT * FROM read_parquet(${quoteText(path)}) LIMIT ${FIRST_ROWS}`),
  )
  return rows.map((row) => ({ ...row, time: new Date(Number(row['time'])).toISOString() }))
}
