import { quoteIdentifier, quoteText } from '../duck/index.ts'
import { NUMBER_CHANNELS, TEXT_CHANNELS, type BaseChannel } from '../sheet/index.ts'
import type { AlikeForm } from './alike-lines.ts'
import type { MappedColumn } from './mapped-column.ts'
import { seriesCellsSql, type SeriesShape } from './series-shape.ts'
import { convertSql } from './units.ts'

/** A file of clean lines (line, time, fields as sent), or a log whose lines are all alike, and what its columns are. */
export interface CleanFile {
  readonly path: string
  /** Set when the file is the log itself. */
  readonly alike: AlikeForm | null
  readonly delimiter: string
  readonly decimalComma: boolean
  readonly maxLineBytes: number
  /** Position of the turbine's name; -1 = `turbineName` in all rows. */
  readonly turbine: number
  readonly turbineName: string
  readonly channels: readonly MappedColumn[]
  /** Set when a line is not one row: then `turbine` and `channels` speak of the rows made of the lines. */
  readonly shape: SeriesShape | null
  /** Positions of the fields of the log that the file holds: c5 is the field in position 5. */
  readonly kept: readonly number[]
  /** Channel -> values that stand for no value. */
  readonly sentinels: ReadonlyMap<string, readonly number[]>
}

/** Words that stand for an empty cell, in lower case. */
const EMPTY_WORDS = [
  '',
  'nan',
  'na',
  'n/a',
  '#n/a',
  'n.a.',
  'null',
  '(null)',
  'none',
  'nil',
  '-',
  '--',
  '---',
  'nd',
  'no data',
  'missing',
  '\\n',
]

const isText = (channel: string) => (TEXT_CHANNELS as readonly string[]).includes(channel)

/**
 * SQL of the file with all cells as text: line, time, c0, c1, ... Nothing is detected, nothing is skipped.
 * @param numbered  whether line numbers are asked for; a log that is read itself has to count them, one thread at a time.
 */
export function cellsSql(file: CleanFile, numbered = true): string {
  if (file.alike) return alikeCellsSql(file, file.alike, numbered)
  const columns = ["'line': 'BIGINT'", "'time': 'BIGINT'", ...file.kept.map(textColumn)]
  const lines = linesSql(file, columns, { skip: 0, lineEnd: '\n' })
  return file.shape ? seriesCellsSql(file.shape, lines) : lines
}

const textColumn = (i: number) => `'c${i}': 'VARCHAR'`

function alikeCellsSql(file: CleanFile, form: AlikeForm, numbered: boolean): string {
  const columns = Array.from({ length: form.fields }, (_, i) => textColumn(i))
  const lines = linesSql(file, columns, { skip: form.headerLine, lineEnd: form.lineEnd })
  const line = numbered ? `row_number() OVER () + ${form.headerLine}` : 'NULL::BIGINT'
  const time = `epoch_ms(c${form.stamp}::TIMESTAMP) - ${form.offsetMs}`
  const kept = file.kept.filter((i) => i !== form.stamp).map((i) => `c${i}`)
  return `(SELECT ${[`${line} AS line`, `${time} AS time`, ...kept].join(', ')} FROM ${lines})`
}

function linesSql(
  file: CleanFile,
  columns: readonly string[],
  { skip, lineEnd }: { skip: number; lineEnd: '\n' | '\r\n' },
): string {
  const newLine = lineEnd === '\n' ? '\\n' : '\\r\\n'
  return (
    `read_csv(${quoteText(file.path)}, auto_detect = false, header = false, skip = ${skip}, delim = ${quoteText(file.delimiter)}, ` +
    `quote = '', escape = '', comment = '', new_line = '${newLine}', nullstr = '', strict_mode = true, ` +
    `max_line_size = ${file.maxLineBytes + 128}, columns = {${columns.join(', ')}})`
  )
}

/**
 * SQL of the rows with canonical columns: src, line, time, turbine, then `channels`, NULL where this file lacks one.
 * @param numbered  whether line numbers are asked for.
 */
export function rowsSql(
  file: CleanFile,
  source: number,
  channels: readonly string[],
  numbered = true,
): string {
  const list = channels.map((channel) => {
    const column = file.channels.find((one) => one.takenFor === channel)
    const name = quoteIdentifier(channel)
    if (!column) return `NULL::${isText(channel) ? 'VARCHAR' : 'DOUBLE'} AS ${name}`
    if (isText(channel)) return `nullif(trim(c${column.index}), '') AS ${name}`
    const value = valueSql(file, column)
    return `CASE WHEN ${isWithinSql(file, channel, value)} THEN ${value} END AS ${name}`
  })
  const turbine = file.turbine < 0 ? quoteText(file.turbineName) : `trim(c${file.turbine})`
  return `SELECT ${[`${source} AS src`, 'line', 'time', `${turbine} AS turbine`, ...list].join(', ')} FROM ${cellsSql(file, numbered)}`
}

/** SQL of one row per number channel of the file, with what became of its cells. */
export function cellCountsSql(file: CleanFile): string {
  const numbers = file.channels.filter((column) => !isText(column.takenFor!))
  const list = numbers.flatMap((column, i) => {
    const cell = `c${column.index}`
    const { max } = limitsOf(column.takenFor!)
    const value = valueSql(file, column)
    // Most cells are numbers: only the others are compared with words.
    const filled = `CASE WHEN ${value} IS NOT NULL AND NOT isnan(${value}) THEN true ELSE lower(trim(${cell})) NOT IN (${EMPTY_WORDS.map(quoteText).join(', ')}) END`
    const unreadable = `${filled} AND ${value} IS NULL`
    return [
      `count(*) FILTER (${filled}) AS filled${i}`,
      `count(*) FILTER (${unreadable}) AS unreadable${i}`,
      `arg_min(${cell}, line) FILTER (${unreadable}) AS example${i}`,
      `min(line) FILTER (${unreadable}) AS exampleLine${i}`,
      `count(*) FILTER (${filled} AND ${value} IS NOT NULL AND NOT (${isWithinSql(file, column.takenFor!, value)})) AS outside${i}`,
      `count(*) FILTER (${value} > ${max}) AS above${i}`,
      `approx_count_distinct(${value}) FILTER (${value} > ${max}) AS aboveKinds${i}`,
    ]
  })
  return list.length === 0 ? '' : `SELECT ${list.join(', ')} FROM ${cellsSql(file)}`
}

/** SQL of whether a value lies within the limits of the channel and is none that stands for nothing. */
function isWithinSql({ sentinels }: CleanFile, channel: string, value: string): string {
  const { min, max } = limitsOf(channel)
  const none = sentinels.get(channel) ?? []
  const list = none.map((one) => `${one}::DOUBLE`).join(', ')
  return `${value} BETWEEN ${min} AND ${max}${none.length > 0 ? ` AND ${value} NOT IN (${list})` : ''}`
}

/** SQL of the number in a cell, canonical unit; NULL when it is none. Thousands separators are never guessed. */
function valueSql(file: CleanFile, column: MappedColumn): string {
  const cell = `c${column.index}`
  const text = file.decimalComma
    ? `CASE WHEN NOT contains(${cell}, '.') THEN replace(${cell}, ',', '.') END`
    : cell
  const value = `try_cast(${text} AS DOUBLE)`
  return column.unit ? convertSql(value, column.unit) : value
}

/** Limits of a channel; those of a standard deviation are 0 and the width of the channel's own. */
export function limitsOf(channel: string): { min: number; max: number; unit: string } {
  const match = /^(.+)_(sd|min|max)$/.exec(channel)
  const base = match && match[1]! in NUMBER_CHANNELS ? match[1]! : channel
  const limits = NUMBER_CHANNELS[base as BaseChannel]
  return match?.[2] === 'sd' && base !== channel
    ? { ...limits, min: 0, max: limits.max - limits.min }
    : limits
}
