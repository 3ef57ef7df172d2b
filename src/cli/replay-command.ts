import { createWriteStream } from 'node:fs'
import { mkdir, readFile, rename, stat, writeFile } from 'node:fs/promises'
import { basename, dirname, extname, join, resolve } from 'node:path'
import { pipeline } from 'node:stream/promises'
import { Type } from 'typebox'
import { InputError } from '../errors.ts'
import type { LogFile, OneShotRequest, RowsFormat } from '../replay/contract.ts'
import { checkShape, parseSite } from '../setup/index.ts'
import { ReadingOptions, type ScoreSheet, type SiteFile } from '../sheet/index.ts'
import { csvTables } from './csv-tables.ts'
import { descriptionText } from './description-text.ts'
import type { CommandParts, Scoring, SettingFlags } from './parts.ts'
import { progressLine } from './progress-line.ts'
import { sheetSummary } from './sheet-summary.ts'

export interface ReplayFlags {
  site?: string
  out?: string
  rows?: string
  dryRun?: boolean
  format: string
  timezone?: string
  stamp?: string
  columns?: string
  turbine?: string
  startDate?: string
  dateOrder?: string
  ratedPower?: string
}

const FORMATS = ['json', 'csv'] as const
const SHEET_NAME = 'score-sheet.json'

const reading = ReadingOptions.properties

/** The flags by the names that a person typed, so that an error names what was typed. */
const Flags = Type.Object({
  '--timezone': reading.timezone,
  '--stamp': reading.stamp,
  '--columns': reading.columns,
  '--turbine': reading.turbine,
  '--start-date': reading.startDate,
  '--date-order': reading.dateOrder,
  '--rated-power': Type.Optional(Type.Number({ exclusiveMinimum: 0, maximum: 50000 })),
})

/** Scores log files and prints the sheet, or writes it and prints a summary. Everything is checked before the logs are read. */
export async function replayCommand(
  logs: readonly string[],
  flags: ReplayFlags,
  settings: SettingFlags,
  parts: CommandParts,
): Promise<void> {
  const formats = parseFormats(flags)
  const rowsFormat = parseRowsFormat(flags.rows)
  await Promise.all(logs.map(checkLog))
  if (logs.filter((log) => log === '-').length > 1) {
    throw new InputError('BAD_OPTION', 'log: expected standard input once, got - twice')
  }
  const site = flags.site === undefined ? {} : await readSite(flags.site)
  const options = await readingFlags(flags)
  if (flags.out !== undefined && flags.dryRun !== true) await mkdir(flags.out, { recursive: true })
  const scoring = await parts.startScoring(settings)
  const progress = progressLine(parts.stderr)
  let sheet: ScoreSheet
  try {
    const files = await logFiles(logs, scoring, parts)
    if (flags.dryRun === true) {
      const described = await scoring.intake.describe(files, options.reading, site)
      parts.stdout.write(described.map(descriptionText).join('\n'))
      return
    }
    const request: OneShotRequest = { logs: files, site, settings: scoring.settings, ...options }
    sheet = await scoring.replays.oneShot(request, progress.show)
    if (flags.rows !== undefined) await writeRows(scoring, sheet.replay, rowsFormat, flags.rows)
  } finally {
    progress.clear()
    await scoring.close()
  }
  const json = `${JSON.stringify(sheet, null, 2)}\n`
  if (flags.out === undefined) {
    parts.stdout.write(json)
    return
  }
  const sheetPath = join(flags.out, SHEET_NAME)
  await replaceFile(sheetPath, json)
  const tables = formats.includes('csv') ? csvTables(sheet) : {}
  for (const [name, csv] of Object.entries(tables)) await replaceFile(join(flags.out, name), csv)
  const written = [sheetPath, ...Object.keys(tables).map((name) => join(flags.out ?? '', name))]
  if (flags.rows !== undefined) written.push(flags.rows)
  parts.stdout.write(sheetSummary(sheet, written))
}

function parseFormats(flags: ReplayFlags): string[] {
  const formats = flags.format.split(',').map((one) => one.trim())
  for (const format of formats) {
    if (!(FORMATS as readonly string[]).includes(format)) {
      throw new InputError('BAD_OPTION', `--format: expected ${FORMATS.join(' or ')}, got "${format}"`)
    }
  }
  if (formats.includes('csv') && flags.out === undefined) {
    throw new InputError('BAD_OPTION', '--format: expected --out with csv, got none')
  }
  return formats
}

const ROWS_FORMATS: Readonly<Record<string, RowsFormat>> = {
  '.csv': 'csv',
  '.parquet': 'parquet',
  '.arrow': 'arrow',
}

function parseRowsFormat(path: string | undefined): RowsFormat {
  if (path === undefined) return 'csv'
  const format = ROWS_FORMATS[extname(path).toLowerCase()]
  if (format !== undefined) return format
  const expected = Object.keys(ROWS_FORMATS).join(', ')
  throw new InputError('BAD_OPTION', `--rows: expected a name that ends with ${expected}, got "${path}"`)
}

/** A reader sees the whole file or none. */
async function writeRows(scoring: Scoring, id: string, format: RowsFormat, path: string): Promise<void> {
  await mkdir(dirname(path), { recursive: true })
  const part = `${path}.part`
  const { stream } = await scoring.replays.rows(id, format)
  await pipeline(stream, createWriteStream(part))
  await rename(part, path)
}

async function checkLog(log: string): Promise<void> {
  if (log === '-') return
  try {
    if (!(await stat(log)).isDirectory()) return
  } catch (cause) {
    throw new InputError('LOG_NOT_FOUND', `${log}: expected a log file, got ${reasonOf(cause)}`, { cause })
  }
  throw new InputError('LOG_NOT_FOUND', `${log}: expected a log file, got a folder`)
}

function reasonOf(error: unknown): string {
  const { code } = error as NodeJS.ErrnoException
  return code === 'ENOENT' ? 'no such file' : (code ?? 'a file that cannot be read')
}

async function readSite(path: string): Promise<SiteFile> {
  let text: string
  try {
    text = await readFile(path, 'utf8')
  } catch (cause) {
    throw new InputError('BAD_SITE', `${path}: expected a site file, got ${reasonOf(cause)}`, { cause })
  }
  return parseSite(text, basename(path))
}

async function readingFlags(flags: ReplayFlags): Promise<{ reading: ReadingOptions; ratedPowerKw?: number }> {
  const given = {
    '--timezone': flags.timezone,
    '--stamp': flags.stamp,
    '--columns': flags.columns === undefined ? undefined : await readColumns(flags.columns),
    '--turbine': flags.turbine,
    '--start-date': flags.startDate,
    '--date-order': flags.dateOrder,
    '--rated-power': flags.ratedPower,
  }
  const present = Object.fromEntries(Object.entries(given).filter(([, value]) => value !== undefined))
  const checked = checkShape(Flags, present, { code: 'BAD_OPTION', place: '', fromText: true })
  const options: ReadingOptions = {}
  if (checked['--timezone'] !== undefined) options.timezone = checked['--timezone']
  if (checked['--stamp'] !== undefined) options.stamp = checked['--stamp']
  if (checked['--columns'] !== undefined) options.columns = checked['--columns']
  if (checked['--turbine'] !== undefined) options.turbine = checked['--turbine']
  if (checked['--start-date'] !== undefined) options.startDate = checked['--start-date']
  if (checked['--date-order'] !== undefined) options.dateOrder = checked['--date-order']
  const ratedPowerKw = checked['--rated-power']
  return ratedPowerKw === undefined ? { reading: options } : { reading: options, ratedPowerKw }
}

/** JSON itself starts with a brace; anything else is the name of a file that holds it. */
async function readColumns(given: string): Promise<unknown> {
  const inline = given.trimStart().startsWith('{')
  try {
    return JSON.parse(inline ? given : await readFile(given, 'utf8')) as unknown
  } catch (cause) {
    const got = cause instanceof SyntaxError ? `text that is none (${cause.message})` : reasonOf(cause)
    throw new InputError('BAD_OPTION', `--columns: expected a JSON object or a file with one, got ${got}`, {
      cause,
    })
  }
}

async function logFiles(logs: readonly string[], scoring: Scoring, parts: CommandParts): Promise<LogFile[]> {
  const files: LogFile[] = []
  for (const log of logs) {
    if (log === '-') {
      const path = join(scoring.tempFolder, 'standard-input')
      await pipeline(parts.stdin, createWriteStream(path, { flags: 'wx', mode: 0o600 }))
      files.push({ name: 'standard input', path })
    } else {
      files.push({ name: basename(log), path: resolve(log) })
    }
  }
  return files
}

/** A reader sees the old file or the new one, never half of one. */
async function replaceFile(path: string, text: string): Promise<void> {
  const part = `${path}.part`
  await writeFile(part, text)
  await rename(part, path)
}
