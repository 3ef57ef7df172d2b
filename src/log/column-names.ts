import { NUMBER_CHANNELS, TEXT_CHANNELS, type BaseChannel, type STATISTICS } from '../sheet/index.ts'
import { findUnit } from './units.ts'
import { USUAL_NAMES } from './usual-names.ts'

/** What a column's name says. */
export interface NamedColumn {
  /** Canonical base channel, text channel, or one of the keys of a row. */
  readonly target: string
  /** Suffix of a statistic; empty for the mean. */
  readonly statistic: '' | (typeof STATISTICS)[number]
  /** Unit written in the name, as written. */
  readonly unit: string | null
  /** How sure the name is: 3 canonical, 2 a usual name marked as mean or a usual name, 1 a name that others share. */
  readonly rank: number
  readonly why: string
}

/** Keys of a row beside the channels. `day` with `clock`, and `date` with `clock`, stand for `time`; `dst` tells summer time. */
export const ROW_KEYS = ['time', 'turbine', 'day', 'clock', 'date', 'dst'] as const

const USUAL_INDEX = new Map<string, string>()
for (const [target, names] of Object.entries(USUAL_NAMES))
  for (const name of names) USUAL_INDEX.set(name, target)

const CANONICAL = new Set<string>([...Object.keys(NUMBER_CHANNELS), ...TEXT_CHANNELS, ...ROW_KEYS])

const MEAN_WORDS = new Set(['avg', 'average', 'mean', 'av', 'mittel', 'mw', 'mittelwert', 'media'])
const STATISTIC_WORDS: Readonly<Record<string, (typeof STATISTICS)[number]>> = {
  sd: 'sd',
  std: 'sd',
  stdev: 'sd',
  stddev: 'sd',
  stdv: 'sd',
  sigma: 'sd',
  min: 'min',
  minimum: 'min',
  max: 'max',
  maximum: 'max',
}

/** Words at the end of a name that give its unit, such as `power_kw`. */
const UNIT_WORDS = new Set([
  'kw',
  'mw',
  'w',
  'ms',
  'us',
  'mps',
  'kmh',
  'kn',
  'deg',
  'degc',
  'rpm',
  'hpa',
  'mbar',
  'pa',
  'pct',
  'rad',
  'k',
  'f',
  'c',
])

/** What the name of a column says about it; undefined when it says nothing that is known. */
export function readName(name: string): NamedColumn | undefined {
  const plain = name.trim()
  const exact = canonicalName(plain.toLowerCase())
  if (exact) return { ...exact, unit: null, rank: 4, why: 'canonical name' }

  const bracket = /[([{<]\s*([^)\]}>]*?)\s*[)\]}>]/.exec(plain)
  const statisticInBracket = bracket ? words(bracket[1]!) : []
  const isStatisticBracket =
    statisticInBracket.length > 0 && statisticInBracket.every((w) => isStatisticWord(w))
  const unitText = bracket && !isStatisticBracket ? bracket[1]! : null
  let parts = words(
    bracket ? plain.replace(bracket[0], isStatisticBracket ? ` ${bracket[1]!} ` : ' ') : plain,
  )

  const all = parts
    .join(' ')
    .replace(/\b(standard|std) (deviation|dev)\b/, 'sd')
    .split(' ')
  const isMean = all.length > 1 && all.some(isMeanWord)
  const statistic = (all.length > 1 && all.map((word) => STATISTIC_WORDS[word]).find((one) => one)) || ''
  parts = all.filter((word, i) => all.length === 1 || !(isMeanWord(word, i, all) || word in STATISTIC_WORDS))
  let target = lookUp(parts.join(''))
  let unit = unitText
  if (!target && unitText === null) {
    for (const taken of [1, 2]) {
      const tail = parts.slice(-taken).join('')
      if (target || parts.length <= taken || !UNIT_WORDS.has(tail)) continue
      target = lookUp(parts.slice(0, -taken).join(''))
      if (target) unit = tail
    }
  }
  if (!target) return undefined
  if (statistic !== '' && !(target in NUMBER_CHANNELS)) return undefined
  const canonical = target in NUMBER_CHANNELS ? NUMBER_CHANNELS[target as BaseChannel].unit : null
  if (unit !== null && canonical !== null && unit !== '' && !findUnit(unit, canonical)) {
    return { target, statistic, unit, rank: 1, why: `usual name with the unknown unit ${unit}` }
  }
  return {
    target,
    statistic,
    unit: unit === '' ? null : unit,
    rank: isMean ? 3 : 2,
    why: isMean ? 'usual name, marked as mean' : 'usual name',
  }
}

/** A canonical name with or without suffix: `vane`, `vane_sd`, `power_avg`. */
export function canonicalName(
  name: string,
): { target: string; statistic: NamedColumn['statistic'] } | undefined {
  if (CANONICAL.has(name)) return { target: name, statistic: '' }
  const suffix = /^(.+)_(sd|min|max|avg|mean)$/.exec(name)
  if (!suffix || !(suffix[1]! in NUMBER_CHANNELS)) return undefined
  const statistic = suffix[2]!
  return {
    target: suffix[1]!,
    statistic: statistic === 'avg' || statistic === 'mean' ? '' : (statistic as NamedColumn['statistic']),
  }
}

function lookUp(key: string): string | undefined {
  const canonical = key.replaceAll('_', '')
  return USUAL_INDEX.get(canonical) ?? CANONICAL_KEYS.get(canonical)
}

const CANONICAL_KEYS = new Map([...CANONICAL].map((name) => [name.replaceAll('_', ''), name]))

/** At the end of a name, mw is the unit; before it, the German mean. */
const isMeanWord = (word: string, i: number, all: readonly string[]) =>
  MEAN_WORDS.has(word) && (word !== 'mw' || i < all.length - 1)

const isStatisticWord = (word: string) => (MEAN_WORDS.has(word) && word !== 'mw') || word in STATISTIC_WORDS

/** Words of a name in lower case: split at marks and at the humps of camel case. */
function words(name: string): string[] {
  return name
    .normalize('NFKD')
    .replace(/\p{M}/gu, '')
    .replace(/([\p{Ll}\d])(\p{Lu})/gu, '$1 $2')
    .toLowerCase()
    .split(/[^\p{L}\p{N}]+/u)
    .filter((word) => word !== '')
}
