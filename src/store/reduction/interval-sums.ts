import { quoteIdentifier } from '../../duck/index.ts'
import { NUMBER_CHANNELS, RAW_CHANNELS } from '../../sheet/index.ts'
import { BIN_SQL } from './high-rate.ts'

/** Numbers are summed as whole millionths of their unit, sines and cosines as whole 1e-12: whole sums know no order. */
export const NUMBER_SCALE = 1e6
export const SINE_SCALE = 1e12

/** kernel/angle/radians.ts, as SQL: the same double. */
const RAD_PER_DEG = '(0.017453292519943295::DOUBLE)'

const ANGLES: ReadonlySet<string> = new Set([
  'vane',
  'vane_2',
  'wind_direction',
  'nacelle_position',
  'reference_direction',
  'reference_yaw_error',
])

const RAW: ReadonlySet<string> = new Set(RAW_CHANNELS)

/** `angle`: unit vectors; `position`: an angle that may be wound over turns; `mean`: a number of which the mean is enough. */
export type ChannelKind = 'number' | 'angle' | 'position' | 'mean'

/** A channel of the log with the statistics of its own rows, where it has some. */
export interface HighRateChannel {
  readonly name: string
  readonly kind: ChannelKind
  readonly hasSd: boolean
  readonly hasMin: boolean
  readonly hasMax: boolean
}

/**
 * Channels among number columns: `wind_speed_sd` belongs to `wind_speed` where that is there too. Columns that are no
 * measurements, such as raw words of an encoder, have no mean and are left out.
 */
export function highRateChannels(columns: readonly string[]): HighRateChannel[] {
  const all = new Set(columns)
  return columns
    .filter((name) => !RAW.has(baseOf(name)))
    .filter((name) => name in NUMBER_CHANNELS || (baseOf(name) in NUMBER_CHANNELS && !all.has(baseOf(name))))
    .map((name) => ({
      name,
      kind: kindOf(name),
      hasSd: all.has(`${name}_sd`),
      hasMin: all.has(`${name}_min`),
      hasMax: all.has(`${name}_max`),
    }))
}

/**
 * SQL of one row per interval: `bin` (its start), `row_count`, and for each channel counts, extremes and whole sums, named
 * by {@link sumName}. Nothing in it depends on the order of rows or on the number of threads.
 *
 * @param source  SQL after FROM, rows of one turbine with `time`
 */
export function intervalSumsSql(source: string, where: string, channels: readonly HighRateChannel[]): string {
  const list = channels.flatMap(sumsOf).map(([name, sql]) => `${sql} AS ${quoteIdentifier(name)}`)
  return `(SELECT ${[`${BIN_SQL} AS bin`, 'count(*) AS row_count', ...list].join(',\n  ')}
    FROM ${source} WHERE ${where} GROUP BY 1)`
}

/** Names of the columns of {@link intervalSumsSql} beside `bin` and `row_count`. */
export function sumNames(channels: readonly HighRateChannel[]): string[] {
  return channels.flatMap((channel) => sumsOf(channel).map(([name]) => name))
}

export type SumKind = 'count' | 'min' | 'max' | 'sum' | 'spread' | 'sin' | 'cos' | 'sdCount' | 'sdSquares'

export function sumName(channel: string, kind: SumKind): string {
  return `${channel}:${kind}`
}

function sumsOf(channel: HighRateChannel): [name: string, sql: string][] {
  const value = finite(channel.name)
  const name = (kind: SumKind) => sumName(channel.name, kind)
  const sums: [string, string][] = [[name('count'), `count(${value})`]]
  if (channel.kind !== 'mean') {
    sums.push([
      name('min'),
      `min(least(${value}, ${channel.hasMin ? finite(`${channel.name}_min`) : value}))`,
    ])
    sums.push([
      name('max'),
      `max(greatest(${value}, ${channel.hasMax ? finite(`${channel.name}_max`) : value}))`,
    ])
  }
  if (channel.kind !== 'angle') {
    const whole = wholeSql(value, NUMBER_SCALE)
    sums.push([name('sum'), `sum(${whole})`])
    // n^2 times the variance, exact: n sum(q^2) - sum(q)^2 of whole q. In floating point the difference loses its digits.
    if (channel.kind !== 'mean') {
      sums.push([
        name('spread'),
        `count(${value}) * sum(${whole}::HUGEINT * ${whole}) - sum(${whole}) * sum(${whole})`,
      ])
    }
  }
  if (channel.kind === 'angle' || channel.kind === 'position') {
    sums.push([name('sin'), `sum(${wholeSql(`sin(${value} * ${RAD_PER_DEG})`, SINE_SCALE)})`])
    sums.push([name('cos'), `sum(${wholeSql(`cos(${value} * ${RAD_PER_DEG})`, SINE_SCALE)})`])
  }
  if (channel.hasSd) {
    const sd = finite(`${channel.name}_sd`)
    const whole = wholeSql(sd, NUMBER_SCALE)
    sums.push([name('sdCount'), `count(${sd})`], [name('sdSquares'), `sum(${whole}::HUGEINT * ${whole})`])
  }
  return sums
}

function baseOf(name: string): string {
  return name.replace(/_(sd|min|max)$/, '')
}

function kindOf(name: string): ChannelKind {
  if (name === 'nacelle_position') return 'position'
  if (name === 'yaw_active' || /_(sd|min|max)$/.test(name)) return 'mean'
  return ANGLES.has(name) ? 'angle' : 'number'
}

function finite(name: string): string {
  const column = quoteIdentifier(name)
  return `CASE WHEN isfinite(${column}) THEN ${column} END`
}

function wholeSql(value: string, scale: number): string {
  return `round(${value} * ${scale})::BIGINT`
}
