import { basename } from 'node:path'
import { InputError } from '../errors.ts'
import { mapColumns, type ColumnMap } from './column-map.ts'
import { sniffEncoding, toUtf8, validUtf8 } from './clean-text.ts'
import type { LogLimits, LogReading, LogSource } from './contract.ts'
import { lineFields, sniffDialect, type Dialect } from './dialect.ts'
import type { ReadableSource } from './parquet-source.ts'
import type { ScanPlan } from './row-scanner.ts'
import { dateClockTime, dayClockTime, stampTime, type RowTime } from './row-time.ts'
import { sourceBytes, startsAsGzip } from './source-bytes.ts'
import { sentLines } from './sent-lines.ts'
import { longSeries } from './series-shape.ts'
import { sniffStamps, type StampFormat } from './stamp-format.ts'
import { dateReader } from './stamp-reader.ts'

const MOST_TAGS = 20_000
const SAMPLE_BYTES = 256 * 1024

/** Everything that the beginning of a source decides. */
export interface SourcePlan {
  readonly source: ReadableSource
  readonly firstBytes: Uint8Array
  readonly isGzip: boolean
  /** Whether the lines may still all be alike, so that SQL can read the log itself. */
  readonly mayBeAlike: boolean
  readonly dialect: Dialect
  readonly map: ColumnMap
  readonly timeFormat: string
  readonly scan: Omit<ScanPlan, 'zone' | 'limits'>
}

interface SampledSource extends LogSource {
  readonly dialect: Dialect
  readonly limits: LogLimits
  readonly encoding: ReturnType<typeof sniffEncoding>
}

/**
 * Looks at the first 256 KiB of a source and decides how the whole is read.
 * @throws InputError LOG_EMPTY, LOG_NO_HEADER, LOG_TOO_MANY_COLUMNS, LOG_COLUMN_MAP, LOG_COLUMNS_MISSING, LOG_TIME, LOG_CORRUPT
 */
export async function planSource(
  source: ReadableSource,
  reading: LogReading,
  limits: LogLimits,
): Promise<SourcePlan> {
  const { bytes, complete } = await firstBytes(source, limits)
  const encoding = sniffEncoding(bytes)
  let sample = ''
  for await (const chunk of toUtf8(one(bytes), encoding)) sample += validUtf8(chunk).bytes.toString('utf8')
  const dialect = sniffDialect(source.name, sample, complete)
  if (!(dialect.header.length <= limits.maxColumns)) {
    throw new InputError(
      'LOG_TOO_MANY_COLUMNS',
      `${source.name} line ${dialect.headerLine}: expected at most ${limits.maxColumns} columns, got ${dialect.header.length}`,
    )
  }
  const sampled = { ...source, dialect, limits, encoding }
  const turbineName = reading.turbine ?? nameFromFile(source.name)
  const map = await withTags(
    sampled,
    mapColumns(source.name, dialect.header, reading.columns ?? {}, dialect.rows),
    turbineName,
  )
  const { time, description } = await rowTime(sampled, map, reading)
  return {
    source,
    firstBytes: bytes.subarray(0, 4096),
    isGzip: await startsAsGzip(source),
    mayBeAlike: true,
    dialect,
    map,
    timeFormat: description,
    scan: {
      name: source.name,
      delimiter: dialect.delimiter,
      jsonKeys: dialect.form === 'json' ? new Map(dialect.header.map((key, i) => [key, i])) : null,
      fields: dialect.header.length,
      kept: keptFields(map),
      headerLine: dialect.headerLine,
      safe: dialect.hasQuotes,
      time,
      // The clock of a log of single values runs per signal: in the repeated hour each tells its own passes apart.
      turbine: map.series?.shape.kind === 'long' ? map.series.shape.tag : map.turbine,
      turbineName,
      dst: map.dst,
      isTag: map.series?.shape.kind === 'long',
    },
  }
}

export async function firstBytes(
  source: LogSource,
  limits: LogLimits,
): Promise<{ bytes: Buffer; complete: boolean }> {
  const { chunks } = await sourceBytes(source, limits)
  const parts: Buffer[] = []
  let length = 0
  let complete = true
  for await (const chunk of chunks) {
    parts.push(chunk)
    length += chunk.length
    if (length >= SAMPLE_BYTES) {
      complete = false
      break
    }
  }
  if (length === 0) throw new InputError('LOG_EMPTY', `${source.name}: expected a log, got no bytes`)
  return {
    bytes: Buffer.concat(parts).subarray(0, SAMPLE_BYTES),
    complete: complete || length < SAMPLE_BYTES,
  }
}

async function* one(bytes: Buffer): AsyncGenerator<Buffer> {
  yield await Promise.resolve(bytes)
}

async function rowTime(
  source: SampledSource,
  map: ColumnMap,
  reading: LogReading,
): Promise<{ time: RowTime; description: string }> {
  const { dialect } = source
  const stamps = async (column: number) => {
    const cells = dialect.rows.map((row) => row[column] ?? '')
    const format = sniffStamps(source.name, dialect.header[column]!, cells, reading.dateOrder)
    return settleOrder(source, column, format)
  }
  if (map.time.kind === 'stamp') {
    const format = await stamps(map.time.stamp)
    return { time: stampTime(map.time.stamp, format.reader), description: format.description }
  }
  if (map.time.kind === 'date-clock') {
    const format = await stamps(map.time.day)
    return { time: dateClockTime(map.time, format.reader), description: `${format.description} with a clock` }
  }
  if (reading.startDate === undefined) {
    throw new InputError(
      'LOG_TIME',
      `${source.name}: the time is a day number (${dialect.header[map.time.day]!}) and a clock (${dialect.header[map.time.clock]!}); ` +
        'state startDate=YYYY-MM-DD, the date of the lowest day number',
      { detail: { question: 'startDate' } },
    )
  }
  const startMs = Date.parse(`${reading.startDate}T00:00:00Z`)
  if (Number.isNaN(startMs)) {
    throw new InputError(
      'BAD_OPTION',
      `startDate: expected YYYY-MM-DD, got ${JSON.stringify(reading.startDate)}`,
    )
  }
  const lowest = await lowestDay(source, map.time.day)
  return {
    time: dayClockTime(map.time, lowest, startMs),
    description: `day number ${lowest} = ${reading.startDate}, with a clock`,
  }
}

/** Lists the signals of a log of single values: the last one may begin at its end. */
async function withTags(source: SampledSource, map: ColumnMap, turbineName: string): Promise<ColumnMap> {
  if (!map.tags) return map
  const tags = new Set<string>()
  await visitCells(source, map.tags.tag, (cell) => {
    if (tags.size < MOST_TAGS) tags.add(cell)
  })
  const series = longSeries([...tags], { ...map.tags, turbine: map.turbine }, turbineName)
  if (series.channels.length === 0) {
    throw new InputError(
      'LOG_COLUMNS_MISSING',
      `${source.name}: one value per line, and no signal in column ${source.dialect.header[map.tags.tag]!} was recognised; there are: ${[...tags].slice(0, 40).join(', ')}`,
    )
  }
  const own = map.columns.map((column) =>
    column.index === map.tags!.tag || column.index === map.tags!.value
      ? { ...column, why: 'name or value of a signal' }
      : column,
  )
  return { ...map, columns: [...own, ...series.columns], channels: series.channels, series }
}

/** The fields that are read on: turbine and channels; the time is written anew, and what has no use is left behind. */
function keptFields(map: ColumnMap): number[] {
  const shape = map.series?.shape
  const own = map.channels.map((column) => column.index)
  if (shape?.kind === 'wide')
    own.splice(0, own.length, ...shape.turbines.flatMap(({ cells }) => cells.filter((cell) => cell !== null)))
  if (shape?.kind === 'long') own.splice(0, own.length, shape.tag, shape.value)
  if (map.turbine >= 0) own.push(map.turbine)
  return [...new Set(own)].sort((a, b) => a - b)
}

/** Visits the cells of one column of the whole file, for the few questions that its beginning cannot answer. */
async function visitCells(
  source: SampledSource,
  column: number,
  visit: (cell: string) => void,
): Promise<void> {
  const { dialect, limits, encoding } = source
  const keys = new Map(dialect.header.map((key, i) => [key, i]))
  for await (const { line, text } of sentLines(source, limits, encoding)) {
    if (line <= dialect.headerLine) continue
    const cell = lineFields(dialect, keys, text)?.[column]?.trim()
    if (cell !== undefined && cell !== '') visit(cell)
  }
}

/** The lowest day number names the start date, and may stand in the last row. */
async function lowestDay(source: SampledSource, column: number): Promise<number> {
  let lowest = Infinity
  await visitCells(source, column, (cell) => {
    if (/^-?\d+(\.0*)?$/.test(cell) && Number(cell) < lowest) lowest = Number(cell)
  })
  return lowest
}

/** Settles day or month first by the first date of the file that can be read in one way only. */
async function settleOrder(source: SampledSource, column: number, format: StampFormat): Promise<StampFormat> {
  if (!format.doubt) return format
  const readers = { dmy: dateReader('dmy'), mdy: dateReader('mdy') }
  const only = { dmy: 0, mdy: 0 }
  await visitCells(source, column, (cell) => {
    const bytes = Buffer.from(cell)
    const [dmy, mdy] = [readers.dmy.read(bytes, 0, bytes.length), readers.mdy.read(bytes, 0, bytes.length)]
    if (Number.isNaN(dmy) !== Number.isNaN(mdy)) only[Number.isNaN(dmy) ? 'mdy' : 'dmy']++
  })
  // One mistyped date must not turn a file round.
  const [order, other] = only.dmy >= only.mdy ? (['dmy', 'mdy'] as const) : (['mdy', 'dmy'] as const)
  if (only[order] === 0 || only[other] * 20 > only[order]) throw format.doubt
  return { reader: readers[order], description: format.description }
}

/** `Q01.csv.gz` -> `Q01`: the turbine's name where neither log nor request gives one. */
export function nameFromFile(name: string): string {
  const plain = basename(name.replaceAll('\\', '/'))
    .replace(/\.(gz|gzip)$/i, '')
    .replace(/\.(csv|tsv|txt|log|dat|json|jsonl|ndjson|parquet)$/i, '')
    // eslint-disable-next-line no-control-regex
    .replace(/[\u0000-\u001f/]/g, '')
    .slice(0, 100)
  return plain === '' || plain === '-' ? 'turbine' : plain
}
