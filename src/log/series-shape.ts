import { quoteText } from '../duck/index.ts'
import { NUMBER_CHANNELS, type BaseChannel } from '../sheet/index.ts'
import type { MappedColumn } from './mapped-column.ts'
import { readName, type NamedColumn } from './column-names.ts'
import { readSeriesName, type SeriesName } from './series-names.ts'
import { findUnit } from './units.ts'

/**
 * How lines become rows where a line is not one row: `wide` lines hold a row of every turbine, `long` lines hold one value.
 * Either way SQL makes rows of text cells from them: c0 is the turbine, c1, c2, ... the channels.
 */
export type SeriesShape =
  | {
      readonly kind: 'wide'
      readonly turbines: readonly { turbine: string; cells: readonly (number | null)[] }[]
    }
  | {
      readonly kind: 'long'
      readonly tag: number
      readonly value: number
      /** Position of the turbine's name; -1 = the tag states it. */
      readonly turbine: number
      readonly tags: readonly { tag: string; turbine: string; cell: number }[]
    }

export interface Series {
  readonly shape: SeriesShape
  /** The channels as columns of the rows: c1, c2, ... */
  readonly channels: readonly MappedColumn[]
  /** What every column, or every tag, was taken for. */
  readonly columns: readonly MappedColumn[]
}

const keyOf = (named: NamedColumn) => named.target + (named.statistic === '' ? '' : `_${named.statistic}`)

/** Rows from a log with one column per turbine and signal. */
export function wideSeries(header: readonly string[], found: ReadonlyMap<number, SeriesName>): Series {
  const channels = seriesChannels([...found.values()])
  const byTurbine = new Map<string, (number | null)[]>()
  const columns: MappedColumn[] = []
  for (const [index, series] of found) {
    const cells = byTurbine.get(series.turbine) ?? new Array<number | null>(channels.length).fill(null)
    byTurbine.set(series.turbine, cells)
    const cell = channels.findIndex((channel) => channel.takenFor === keyOf(series))
    const isFree = cells[cell] === null
    if (isFree) cells[cell] = index
    columns.push(seriesColumn(header[index]!, index, series, isFree ? channels[cell]! : null))
  }
  const turbines = [...byTurbine].map(([turbine, cells]) => ({ turbine, cells }))
  return { shape: { kind: 'wide', turbines }, channels, columns }
}

/**
 * Rows from a log of single values.
 * @param turbineName  for tags that state none, when there is no column of turbines.
 */
export function longSeries(
  tags: readonly string[],
  at: { tag: number; value: number; turbine: number },
  turbineName: string,
): Series {
  const named = tags.map((tag) => {
    const plain = readName(tag)
    const whole = plain && plain.target in NUMBER_CHANNELS ? { ...plain, turbine: turbineName } : undefined
    return { tag, series: whole ?? readSeriesName(tag) }
  })
  const channels = seriesChannels(named.flatMap(({ series }) => series ?? []))
  const taken = new Set<string>()
  const list: { tag: string; turbine: string; cell: number }[] = []
  const columns = named.map(({ tag, series }) => {
    const cell = series ? channels.findIndex((channel) => channel.takenFor === keyOf(series)) : -1
    const key = series ? `${series.turbine}\n${cell}` : ''
    const isFree = series !== undefined && !taken.has(key)
    if (isFree) {
      taken.add(key)
      list.push({ tag, turbine: series.turbine, cell })
    }
    return seriesColumn(tag, at.value, series, isFree ? channels[cell]! : null)
  })
  return { shape: { kind: 'long', ...at, tags: list }, channels, columns }
}

function seriesChannels(found: readonly SeriesName[]): MappedColumn[] {
  const order = Object.keys(NUMBER_CHANNELS).flatMap((base) => [
    base,
    `${base}_sd`,
    `${base}_min`,
    `${base}_max`,
  ])
  const keys = order.filter((key) => found.some((series) => keyOf(series) === key))
  return keys.map((takenFor, i) => {
    const series =
      found.find((one) => keyOf(one) === takenFor && one.unit !== null) ??
      found.find((one) => keyOf(one) === takenFor)!
    const canonical = NUMBER_CHANNELS[series.target as BaseChannel].unit
    const stated = series.unit === null ? undefined : findUnit(series.unit, canonical)
    return {
      name: takenFor,
      index: i + 1,
      takenFor,
      unit: stated ?? findUnit(canonical, canonical)!,
      unitText: stated ? series.unit : canonical,
      unitStated: stated !== undefined,
      why: '',
    }
  })
}

function seriesColumn(
  name: string,
  index: number,
  series: SeriesName | undefined,
  channel: MappedColumn | null,
): MappedColumn {
  const base = { name, index, unit: null, unitStated: channel?.unitStated ?? false }
  if (!series) return { ...base, takenFor: null, unitText: null, why: 'not used: unknown name' }
  if (!channel)
    return {
      ...base,
      takenFor: null,
      unitText: null,
      why: `not used: ${series.turbine} has another one of it`,
    }
  return {
    ...base,
    takenFor: channel.takenFor,
    unitText: channel.unitText,
    why: `${series.why}; turbine ${series.turbine}`,
  }
}

/** SQL of the rows: line, time, c0 = turbine, c1 ... = the channels as text. */
export function seriesCellsSql(shape: SeriesShape, cells: string): string {
  if (shape.kind === 'wide') {
    const width = shape.turbines[0]!.cells.length
    const structs = shape.turbines.map(({ turbine, cells: own }) => {
      const list = own.map((index, k) => `'c${k + 1}': ${index === null ? 'NULL::VARCHAR' : `c${index}`}`)
      return `{'c0': ${quoteText(turbine)}, ${list.join(', ')}}`
    })
    const fields = Array.from({ length: width + 1 }, (_, k) => `u.c${k}`)
    return `(SELECT line, time, ${fields.join(', ')} FROM (SELECT line, time, unnest([${structs.join(', ')}]) AS u FROM ${cells}))`
  }
  const { tags, tag, value, turbine } = shape
  const values = tags.map((one) => `(${quoteText(one.tag)}, ${quoteText(one.turbine)}, ${one.cell})`)
  const width = Math.max(...tags.map(({ cell }) => cell)) + 1
  const list = Array.from(
    { length: width },
    (_, k) => `arg_max(c${value}, line) FILTER (m.cell = ${k}) AS c${k + 1}`,
  )
  const owner = turbine < 0 ? 'm.turbine' : `trim(c${turbine})`
  return (
    `(SELECT min(line) AS line, time, ${owner} AS c0, ${list.join(', ')} FROM ${cells} ` +
    `JOIN (VALUES ${values.join(', ')}) m(tag, turbine, cell) ON trim(c${tag}) = m.tag GROUP BY time, ${owner})`
  )
}
