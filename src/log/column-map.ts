import { InputError } from '../errors.ts'
import { NUMBER_CHANNELS, TEXT_CHANNELS, type BaseChannel, type ColumnSource } from '../sheet/index.ts'
import { canonicalName, readName, ROW_KEYS, type NamedColumn } from './column-names.ts'
import type { MappedColumn } from './mapped-column.ts'
import { findTagColumns, findWideColumns } from './series-names.ts'
import { wideSeries, type Series } from './series-shape.ts'
import { findUnit, requireUnit } from './units.ts'
import { isVaneByValues } from './vane-by-values.ts'

export interface ColumnMap {
  readonly columns: readonly MappedColumn[]
  /** Positions of the columns that make the time: a stamp, or day or date with a clock. */
  readonly time:
    | { readonly kind: 'stamp'; readonly stamp: number }
    | { readonly kind: 'day-clock'; readonly day: number; readonly clock: number }
    | { readonly kind: 'date-clock'; readonly day: number; readonly clock: number }
  /** Position of the turbine's name; -1 = no such column. */
  readonly turbine: number
  /** Position of the column that tells whether the clock shows summer time; -1 = no such column. */
  readonly dst: number
  /** Channels to be staged, in canonical order. */
  readonly channels: readonly MappedColumn[]
  /** Set when a line is not one row; `tags` while the signals of a log of single values are still to be listed. */
  readonly series?: Series
  readonly tags?: { readonly tag: number; readonly value: number }
}

/** A proposal to take a column for something. */
interface Claim extends NamedColumn {
  readonly index: number
}

/**
 * Decides what every column is. An explicit map wins over names; of several columns with names for one channel the canonical
 * one wins, then one marked as mean, then the first.
 *
 * @param header  names of the columns.
 * @param explicit  canonical channel -> column of the log.
 * @param rows  data lines of the beginning, split, for what names leave open.
 * @throws InputError LOG_COLUMN_MAP, LOG_COLUMNS_MISSING
 */
export function mapColumns(
  name: string,
  header: readonly string[],
  explicit: Readonly<Record<string, ColumnSource>>,
  rows: readonly (readonly string[])[],
): ColumnMap {
  const given = readExplicit(name, header, explicit)
  const takenBy = new Map<string, Claim>()
  const why = new Map<number, string>()
  for (const claim of given) {
    takenBy.set(claim.target + suffix(claim.statistic), claim)
    why.set(claim.index, claim.why)
  }
  const wide = given.some((claim) => claim.target === 'turbine' || claim.target in NUMBER_CHANNELS)
    ? null
    : findWideColumns(header)
  const tags = given.some((claim) => claim.target in NUMBER_CHANNELS) ? null : findTagColumns(header)
  const claims = header
    .map((text, index) => ({ index, named: text === '' ? undefined : readName(text) }))
    .filter(({ index, named }) => {
      // Beside wide columns or single values only the keys of a row are looked for.
      if ((wide ?? tags) && named && !isRowKey(named.target)) return false
      return !given.some((claim) => claim.index === index)
    })
    .flatMap(({ index, named }) => (named ? [{ ...named, index }] : []))
    .sort((a, b) => b.rank - a.rank || a.index - b.index)
  for (const claim of claims) {
    const key = claim.target + suffix(claim.statistic)
    const holder = takenBy.get(key)
    if (holder) {
      why.set(claim.index, `not used: ${key} is taken from ${header[holder.index]!}`)
      continue
    }
    takenBy.set(key, claim)
    why.set(claim.index, claim.why)
  }
  takeVaneByValues(takenBy, given, rows, why)
  const time = findTime(name, header, takenBy, rows)
  const columns = header.map((text, index): MappedColumn => {
    const claim = [...takenBy.values()].find((one) => one.index === index)
    if (!claim) {
      const reason =
        why.get(index) ?? (text === '' ? 'not used: the column has no name' : 'not used: unknown name')
      return { name: text, index, takenFor: null, unit: null, unitText: null, unitStated: false, why: reason }
    }
    return describe(text, claim, why.get(index) ?? claim.why)
  })
  const dst = takenBy.get('dst')?.index ?? -1
  if (wide) {
    const series = wideSeries(header, wide)
    const all = columns.map((column) => series.columns.find((one) => one.index === column.index) ?? column)
    return { columns: all, time, dst, turbine: -1, channels: series.channels, series }
  }
  const turbine = takenBy.get('turbine')?.index ?? -1
  if (tags) return { columns, time, dst, turbine, channels: [], tags }
  const channels = inCanonicalOrder(columns)
  if (channels.length === 0) throw nothingRecognised(name, header, 'no channel but time')
  return { columns, time, dst, turbine, channels }
}

const isRowKey = (target: string) => (ROW_KEYS as readonly string[]).includes(target)

const suffix = (statistic: NamedColumn['statistic']) => (statistic === '' ? '' : `_${statistic}`)

function readExplicit(
  name: string,
  header: readonly string[],
  explicit: Readonly<Record<string, ColumnSource>>,
): Claim[] {
  const claims: Claim[] = []
  for (const [key, source] of Object.entries(explicit)) {
    const canonical = canonicalName(key)
    if (!canonical) {
      throw new InputError(
        'LOG_COLUMN_MAP',
        `columns.${key}: expected one of ${[...ROW_KEYS, ...Object.keys(NUMBER_CHANNELS), ...TEXT_CHANNELS].join(', ')} (numbers also with _sd, _min, _max), got ${JSON.stringify(key)}`,
      )
    }
    const column = typeof source === 'string' ? source : source.column
    let index = header.indexOf(column)
    if (index < 0) index = header.findIndex((text) => text.toLowerCase() === column.trim().toLowerCase())
    if (index < 0) {
      throw new InputError(
        'LOG_COLUMN_MAP',
        `columns.${key}: expected a column of ${name}, got ${JSON.stringify(column)}; there are: ${listed(header)}`,
        { detail: { columns: header } },
      )
    }
    const other = claims.find((claim) => claim.index === index)
    if (other) {
      throw new InputError('LOG_COLUMN_MAP', `columns.${key}: ${column} is named for ${other.target} already`)
    }
    const unit = typeof source === 'string' ? null : (source.unit ?? null)
    if (unit !== null) {
      if (!(canonical.target in NUMBER_CHANNELS)) {
        throw new InputError('LOG_COLUMN_MAP', `columns.${key}.unit: expected none, ${key} has no unit`)
      }
      requireUnit(unit, key, NUMBER_CHANNELS[canonical.target as BaseChannel].unit)
    }
    claims.push({
      ...canonical,
      unit: unit ?? readName(column)?.unit ?? null,
      rank: 9,
      index,
      why: 'named in the column map',
    })
  }
  return claims
}

/** Some logs call their vane a wind direction: the values tell. What the caller named stays as named. */
function takeVaneByValues(
  takenBy: Map<string, Claim>,
  given: readonly Claim[],
  rows: readonly (readonly string[])[],
  why: Map<number, string>,
): void {
  const claim = takenBy.get('wind_direction')
  if (!claim || takenBy.has('vane') || given.includes(claim)) return
  const cells = (column: number) => rows.map((row) => row[column] ?? '')
  const power = takenBy.get('power')
  if (!isVaneByValues(cells(claim.index), power ? cells(power.index) : null)) return
  takenBy.delete('wind_direction')
  takenBy.set('vane', { ...claim, target: 'vane' })
  why.set(
    claim.index,
    'a direction by name, taken for the vane because it is signed and stays near zero while producing',
  )
}

function findTime(
  name: string,
  header: readonly string[],
  takenBy: Map<string, Claim>,
  rows: readonly (readonly string[])[],
): ColumnMap['time'] {
  const index = (key: string) => takenBy.get(key)?.index ?? -1
  const isClock = (column: number) => {
    const cells = rows.map((row) => row[column] ?? '').filter((cell) => cell !== '')
    return (
      cells.length > 0 && cells.every((cell) => /^\d{1,2}:\d{2}(:\d{2}([.,]\d+)?)?( ?[ap]m)?$/i.test(cell))
    )
  }
  // A column called Time beside one called Date holds the clock.
  if (
    index('clock') < 0 &&
    (index('date') >= 0 || index('day') >= 0) &&
    index('time') >= 0 &&
    isClock(index('time'))
  ) {
    takenBy.set('clock', { ...takenBy.get('time')!, target: 'clock' })
    takenBy.delete('time')
  }
  if (index('time') < 0 && index('clock') >= 0) {
    if (index('date') >= 0) return { kind: 'date-clock', day: index('date'), clock: index('clock') }
    if (index('day') >= 0) return { kind: 'day-clock', day: index('day'), clock: index('clock') }
    // A column whose usual name is that of a clock may hold the whole stamp.
    if (!isClock(index('clock'))) {
      takenBy.set('time', { ...takenBy.get('clock')!, target: 'time' })
      takenBy.delete('clock')
    }
  }
  if (index('time') < 0 && index('date') >= 0 && index('clock') < 0) {
    takenBy.set('time', { ...takenBy.get('date')!, target: 'time' })
    takenBy.delete('date')
  }
  for (const key of ['day', 'clock', 'date']) if (index('time') >= 0) takenBy.delete(key)
  if (index('time') < 0) throw nothingRecognised(name, header, 'no column of time', takenBy)
  return { kind: 'stamp', stamp: index('time') }
}

function describe(name: string, claim: Claim, why: string): MappedColumn {
  const takenFor = claim.target + suffix(claim.statistic)
  const base = { name, index: claim.index, takenFor }
  if (!(claim.target in NUMBER_CHANNELS))
    return { ...base, unit: null, unitText: null, unitStated: false, why }
  const canonical = NUMBER_CHANNELS[claim.target as BaseChannel].unit
  const stated = claim.unit === null ? undefined : findUnit(claim.unit, canonical)
  const unit = stated ?? findUnit(canonical, canonical)!
  const unitText = stated ? claim.unit : canonical
  const source = stated ? 'unit stated' : 'unit not stated, the canonical one is taken'
  return { ...base, unit, unitText, unitStated: stated !== undefined, why: `${why}; ${source}` }
}

function inCanonicalOrder(columns: readonly MappedColumn[]): MappedColumn[] {
  const order = [
    ...Object.keys(NUMBER_CHANNELS).flatMap((base) => [base, `${base}_sd`, `${base}_min`, `${base}_max`]),
    ...TEXT_CHANNELS,
  ]
  return order.flatMap((channel) => columns.find((column) => column.takenFor === channel) ?? [])
}

function nothingRecognised(
  name: string,
  header: readonly string[],
  what: string,
  takenBy?: Map<string, Claim>,
): InputError {
  const seen = takenBy ? [...takenBy].map(([key, claim]) => `${key} from ${header[claim.index]!}`) : []
  return new InputError(
    'LOG_COLUMNS_MISSING',
    `${name}: ${what} was recognised${seen.length > 0 ? ` (recognised: ${seen.join(', ')})` : ''}; the columns are: ${listed(header)}. ` +
      'Name them, for example columns={"time":"...","turbine":"...","wind_speed":"...","vane":"...","power":"..."}',
    { detail: { columns: header, recognised: seen } },
  )
}

const listed = (header: readonly string[]) =>
  header.slice(0, 60).join(', ') + (header.length > 60 ? `, ... (${header.length} in all)` : '')
