import { NUMBER_CHANNELS } from '../sheet/index.ts'
import { readName, type NamedColumn } from './column-names.ts'

/** A name that states turbine and signal, such as `Q01 wind speed`, `Q01.WTUR.W`, `power_Q01`. */
export interface SeriesName extends NamedColumn {
  readonly turbine: string
}

const SEPARATOR = /[\s._:/|\\-]+/g
/** A log of single values: which columns hold the name of the signal, and the value. */
const TAG_NAMES = new Set([
  'tag',
  'tagname',
  'tagid',
  'signal',
  'signalname',
  'point',
  'pointname',
  'variable',
  'sensor',
  'parameter',
  'series',
  'item',
  'itemname',
  'channel',
])
const VALUE_NAMES = new Set(['value', 'val', 'wert', 'reading', 'numericvalue', 'itemvalue'])

const letters = (name: string) => name.toLowerCase().replace(/[^\p{L}\p{N}]/gu, '')

/**
 * Splits a name into turbine and signal at one of its separators. The turbine's part holds a digit: `Gearbox temperature` is
 * no turbine called Gearbox.
 */
export function readSeriesName(name: string): SeriesName | undefined {
  let best: SeriesName | undefined
  for (const match of name.matchAll(SEPARATOR)) {
    const left = name.slice(0, match.index)
    const right = name.slice(match.index + match[0].length)
    for (const [turbine, signal] of [
      [left, right],
      [right, left],
    ] as const) {
      if (!/\d/.test(turbine) || turbine.length > 100 || /[()[\]]/.test(turbine)) continue
      const named = readName(signal)
      if (!named || !(named.target in NUMBER_CHANNELS)) continue
      // `Wind speed Q01` is the wind speed of Q01, and not the wind of a turbine called `speed Q01`.
      if (!best || turbine.length < best.turbine.length) best = { ...named, turbine: turbine.trim() }
    }
  }
  return best
}

/**
 * The columns of a log with one column per turbine and signal; null when it is none: fewer than two turbines with one and the
 * same signal, or none with a signal that the job is about.
 */
export function findWideColumns(header: readonly string[]): Map<number, SeriesName> | null {
  const found = new Map<number, SeriesName>()
  header.forEach((name, index) => {
    const series = readName(name) ? undefined : readSeriesName(name)
    if (series) found.set(index, series)
  })
  const turbinesOf = (target: string) =>
    new Set(
      [...found.values()]
        .filter((one) => one.target === target && one.statistic === '')
        .map((one) => one.turbine),
    )
  const isWide = ['wind_speed', 'power', 'vane', 'nacelle_position'].some(
    (target) => turbinesOf(target).size >= 2,
  )
  return isWide ? found : null
}

/** Positions of signal name and value in a log of single values; null when it is none. */
export function findTagColumns(header: readonly string[]): { tag: number; value: number } | null {
  const tag = header.findIndex((name) => TAG_NAMES.has(letters(name)))
  const value = header.findIndex((name) => VALUE_NAMES.has(letters(name)))
  return tag >= 0 && value >= 0 ? { tag, value } : null
}
