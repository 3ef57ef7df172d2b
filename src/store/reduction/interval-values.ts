import { unitVectorMean, wrap180, wrap360, yamartinoSigma } from '../../kernel/angle/index.ts'
import { medianOf } from '../../kernel/stats/index.ts'
import { NUMBER_SCALE, SINE_SCALE, sumName, type HighRateChannel, type SumKind } from './interval-sums.ts'

/** Readings this far outside of any single turn are of a scale that is wound over several, degrees. */
const WOUND_SLACK_DEG = 5

/** Of the values that a channel usually has in an interval, so many make its statistics. */
const VALUES_SHARE = 0.75

/** Sums of one turbine's intervals by {@link sumName}; NaN where an interval has no value of a channel; length n. */
export type IntervalSums = Readonly<Record<string, Float64Array>>

/**
 * Statistics of intervals from their sums, by canonical column: the bare name is the mean, `_sd _min _max` as suffixes.
 *
 * Numbers: arithmetic mean, standard deviation with divisor n. Angles: unit-vector mean and Yamartino's sigma, on the
 * scale of the readings (signed or 0 to 360); extremes are those of the readings, and NaN where they wrapped. A nacelle
 * position wound over several turns keeps its turns: there the mean is that of the readings. Where the rows carry a spread
 * of their own, it is added in squares. One row alone has no spread.
 *
 * NaN where a channel has fewer than 0.75 of the values that it usually has in an interval.
 *
 * @param rows  rows of each interval, any value of theirs missing or not; length n.
 */
export function intervalValues(
  channels: readonly HighRateChannel[],
  sums: IntervalSums,
  rows: Float64Array,
): Record<string, Float64Array> {
  const values: Record<string, Float64Array> = {}
  for (const channel of channels) {
    const of = (kind: SumKind): Float64Array => sums[sumName(channel.name, kind)]!
    const isKnown = knownIntervals(of('count'), rows)
    const put = (suffix: string, value: (i: number) => number) => {
      values[`${channel.name}${suffix}`] = Float64Array.from(rows, (_, i) => (isKnown(i) ? value(i) : NaN))
    }
    const own = channel.hasSd ? meanSquare(of('sdSquares'), of('sdCount')) : undefined
    const spread = (i: number, between: number) => {
      const inside = own?.[i] ?? NaN
      if (!(of('count')[i]! > 1)) return Math.sqrt(inside)
      return Number.isNaN(inside) ? between : Math.sqrt(between * between + inside)
    }
    if (channel.kind === 'mean') {
      put('', (i) => of('sum')[i]! / (NUMBER_SCALE * of('count')[i]!))
      continue
    }
    const isPlain =
      channel.kind === 'number' || (channel.kind === 'position' && isWound(of('min'), of('max')))
    if (isPlain) {
      put('', (i) => of('sum')[i]! / (NUMBER_SCALE * of('count')[i]!))
      put('_sd', (i) => spread(i, Math.sqrt(of('spread')[i]!) / (NUMBER_SCALE * of('count')[i]!)))
      put('_min', (i) => of('min')[i]!)
      put('_max', (i) => of('max')[i]!)
      continue
    }
    const isSigned = of('min').some((angle) => angle < 0)
    const mean = (kind: 'sin' | 'cos', i: number) => of(kind)[i]! / (SINE_SCALE * of('count')[i]!)
    const stoodStill = (i: number) => of('min')[i] === of('max')[i]
    put('', (i) => {
      const { direction } = unitVectorMean(mean('sin', i), mean('cos', i), 1)
      return isSigned ? wrap180(direction) : wrap360(direction)
    })
    // Rounded sums would leave a spread of 1e-4 degrees to an angle that never moved.
    put('_sd', (i) => spread(i, stoodStill(i) ? 0 : yamartinoSigma(mean('sin', i), mean('cos', i))))
    const wrapped = (i: number) => !(of('max')[i]! - of('min')[i]! < 180)
    put('_min', (i) => (wrapped(i) ? NaN : of('min')[i]!))
    put('_max', (i) => (wrapped(i) ? NaN : of('max')[i]!))
  }
  return values
}

/** A channel may be logged less often than rows come: it is measured against its own habit. */
function knownIntervals(count: Float64Array, rows: Float64Array): (i: number) => boolean {
  const share = count.map((values, i) => values / rows[i]!)
  const usual = medianOf(share)
  return (i) => count[i]! > 0 && share[i]! >= VALUES_SHARE * usual
}

function isWound(min: Float64Array, max: Float64Array): boolean {
  return (
    min.some((angle) => angle < -180 - WOUND_SLACK_DEG) || max.some((angle) => angle > 360 + WOUND_SLACK_DEG)
  )
}

function meanSquare(squares: Float64Array, count: Float64Array): Float64Array {
  return squares.map((sum, i) => sum / (NUMBER_SCALE * NUMBER_SCALE * count[i]!))
}
