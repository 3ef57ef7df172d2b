import { InputError } from '../../errors.ts'
import { robustSd } from './robust.ts'

/** What a stretch of a series costs when it is described by one set of values. */
export interface SegmentCost {
  /** Number of points, n. */
  readonly length: number
  /** Cost of the points [from, to), 0 <= from < to <= length; constant time. */
  of(from: number, to: number): number
  /**
   * The most by which two parts together may cost more than the whole; 0 for costs that fall with every split. The
   * search stays exact as long as this bound holds.
   */
  readonly splitExcess: number
}

export interface ChangePointOptions {
  /** What one more change costs, in units of the cost; >= 0. */
  readonly penalty: number
  /** Points in the shortest segment, default 1. */
  readonly minLength?: number
}

export interface ChangePoints {
  /** Last point of the left segment of each change counted from 1 (so: points before the change), rising. */
  readonly changes: readonly number[]
  /** Sum of the segments' costs, without penalties. */
  readonly cost: number
}

/**
 * Sum of squares about the segment's mean: changes of the mean, with a variance that is known and the same everywhere.
 * For penalties such as 2 ln n divide by that variance, or multiply the penalty by it ({@link differenceSd}).
 *
 * @param values  length n, finite.
 * @throws InputError OUT_OF_RANGE for a value that is not finite
 */
export function meanCost(values: ArrayLike<number>): SegmentCost {
  const { sum, squares } = centredSums(values)
  return {
    length: values.length,
    splitExcess: 0,
    of(from, to) {
      const total = sum[to]! - sum[from]!
      return Math.max(0, squares[to]! - squares[from]! - (total * total) / (to - from))
    },
  }
}

/**
 * Twice the negative log-likelihood of a normal distribution with mean and variance of the segment: changes of either.
 *
 * @param values  length n, finite.
 * @param varianceFloor  > 0: no segment's variance is taken to be less. Values that rounding makes equal would otherwise
 *   make a segment of their own at any penalty: take the square of the step of rounding over 12, or what is believable.
 * @throws InputError OUT_OF_RANGE
 */
export function meanVarianceCost(values: ArrayLike<number>, varianceFloor: number): SegmentCost {
  if (!(varianceFloor > 0) || varianceFloor === Infinity)
    throw new InputError('OUT_OF_RANGE', `varianceFloor: expected a number above 0, got ${varianceFloor}`)
  const squaresOf = meanCost(values)
  return {
    length: values.length,
    splitExcess: 0,
    of(from, to) {
      const n = to - from
      const squares = squaresOf.of(from, to)
      const variance = Math.max(squares / n, varianceFloor)
      return n * Math.log(2 * Math.PI * variance) + squares / variance
    },
  }
}

/**
 * Residual sum of squares of y = b x with one b for the segment, from sums per point: a point may be a day of many rows.
 * Levels, if any, are taken out of x and y before the sums are made.
 *
 * @param xx, xy, yy  sums of w x x, w x y and w y y; length n, finite, xx and yy >= 0. Where yy is not known, zeros do: it
 *   shifts the cost of every partition alike. A point with xx = 0 has no say.
 * @throws InputError LENGTH_MISMATCH, OUT_OF_RANGE
 */
export function slopeCost(xx: ArrayLike<number>, xy: ArrayLike<number>, yy: ArrayLike<number>): SegmentCost {
  for (const [name, values] of [
    ['xy', xy],
    ['yy', yy],
  ] as const) {
    if (values.length !== xx.length)
      throw new InputError('LENGTH_MISMATCH', `${name}: expected ${xx.length} values, got ${values.length}`)
  }
  const sumXx = prefixSums('xx', xx)
  const sumXy = prefixSums('xy', xy)
  const sumYy = prefixSums('yy', yy)
  return {
    length: xx.length,
    splitExcess: 0,
    of(from, to) {
      const spread = sumXx[to]! - sumXx[from]!
      const joint = sumXy[to]! - sumXy[from]!
      return sumYy[to]! - sumYy[from]! - (spread > 0 ? (joint * joint) / spread : 0)
    },
  }
}

/**
 * The cost with ln(points of the segment) added, as the modified information criterion has it; with {@link mbicPenalty}.
 *
 * @source Zhang & Siegmund (2007), A modified Bayes information criterion, Biometrics 63, 22-32.
 */
export function withLogLength(cost: SegmentCost): SegmentCost {
  return {
    length: cost.length,
    // ln a + ln b - ln(a + b) is largest for equal halves.
    splitExcess: cost.splitExcess + Math.max(0, Math.log(cost.length / 4)),
    of: (from, to) => cost.of(from, to) + Math.log(to - from),
  }
}

/**
 * Schwarz's criterion: parameters x ln n, for a cost that is twice a negative log-likelihood.
 *
 * @param parameters  that one more change adds: 1 for a mean, 2 for mean and variance; one more to count its place.
 */
export function bicPenalty(points: number, parameters: number): number {
  return parameters * Math.log(points)
}

/** The modified criterion: (parameters + 2) ln n, the place not counted; for costs of {@link withLogLength}. */
export function mbicPenalty(points: number, parameters: number): number {
  return (parameters + 2) * Math.log(points)
}

/**
 * Standard deviation of independent noise about a mean that changes now and then, from differences of neighbours.
 *
 * @param values  NaN = missing: its two differences are skipped.
 * @returns NaN with fewer than two neighbours.
 */
export function differenceSd(values: ArrayLike<number>): number {
  const differences = new Float64Array(Math.max(0, values.length - 1))
  for (let i = 0; i < differences.length; i++) differences[i] = values[i + 1]! - values[i]!
  return robustSd(differences) / Math.SQRT2
}

/**
 * The partition of a series that costs least, of all there are: every change costs the penalty, every segment its cost.
 *
 * Optimal partitioning with the pruning of PELT. Time O(n) where changes keep coming, O(n^2) for a series without any;
 * memory O(n). Of equally good partitions one is given.
 *
 * @returns no change, cost 0, for an empty series; no change where n < 2 minLength.
 * @throws InputError OUT_OF_RANGE for a penalty below 0 or a minLength that is no whole number above 0
 * @source Jackson et al. (2005), IEEE Signal Processing Letters 12, 105-108; Killick, Fearnhead & Eckley (2012), JASA 107,
 *   1590-1598, theorem 3.1, the pruning put off by minLength points.
 */
export function changePoints(cost: SegmentCost, options: ChangePointOptions): ChangePoints {
  const { penalty, minLength = 1 } = options
  if (!(penalty >= 0)) throw new InputError('OUT_OF_RANGE', `penalty: expected >= 0, got ${penalty}`)
  if (!(Number.isInteger(minLength) && minLength >= 1))
    throw new InputError('OUT_OF_RANGE', `minLength: expected a whole number above 0, got ${minLength}`)
  const n = cost.length
  if (n === 0) return { changes: [], cost: 0 }
  if (n < 2 * minLength) return { changes: [], cost: cost.of(0, n) }

  // least[t]: cost of the best partition of the first t points, penalties included.
  const least = new Float64Array(n + 1).fill(Infinity)
  const lastStart = new Int32Array(n + 1)
  /** From this end on, a start can no longer be best. */
  const lapsesAt = new Float64Array(n + 1).fill(Infinity)
  least[0] = -penalty
  const starts = [0]
  for (let end = minLength; end <= n; end++) {
    const newest = end - minLength
    if (newest >= minLength) starts.push(newest)
    let best = Infinity
    let bestStart = 0
    const total = new Float64Array(starts.length)
    let kept = 0
    for (const start of starts) {
      if (end >= lapsesAt[start]!) continue
      const value = least[start]! + cost.of(start, end)
      starts[kept] = start
      total[kept++] = value
      if (value + penalty < best) {
        best = value + penalty
        bestStart = start
      }
    }
    starts.length = kept
    least[end] = best
    lastStart[end] = bestStart
    // A split at `end` beats the start for all ends that leave room for a segment behind it.
    for (let k = 0; k < kept; k++) {
      if (total[k]! - cost.splitExcess > best) {
        const start = starts[k]!
        lapsesAt[start] = Math.min(lapsesAt[start]!, end + minLength)
      }
    }
  }
  const changes: number[] = []
  for (let end = n; lastStart[end]! > 0; end = lastStart[end]!) changes.push(lastStart[end]!)
  changes.reverse()
  return { changes, cost: partitionCost(cost, changes) }
}

/** Sum of the costs of the segments between changes, without penalties. */
export function partitionCost(cost: SegmentCost, changes: readonly number[]): number {
  let total = 0
  let from = 0
  for (const change of [...changes, cost.length]) {
    total += cost.of(from, change)
    from = change
  }
  return total
}

/**
 * Where one change between two others may lie: all places at which the two segments cost at most
 * -2 ln(1 - sqrt(level)) x scale more than at the best one (7.35 x scale at 95 %), from the first to the last.
 *
 * The set of places that a likelihood ratio test of the place does not reject. It leans on a change that is small against
 * the noise of a point; for larger ones it covers more often than `level` says.
 *
 * @param place.from, place.to  the segments on both sides are [from, change) and [change, to).
 * @param place.scale  variance of the noise for a cost in squares, 1 for twice a negative log-likelihood; >= 0.
 * @param place.minLength  default 1.
 * @returns the best place and both ends of the set, as in {@link ChangePoints.changes}.
 * @throws InputError OUT_OF_RANGE where there is no room for a change
 * @source Hansen (2000), Sample splitting and threshold estimation, Econometrica 68, 575-603, theorem 1: the distribution
 *   of the ratio, P(LR <= x) = (1 - exp(-x / 2))^2. Bai (1997) takes a symmetric interval from the same limit instead.
 */
export function changeInterval(
  cost: SegmentCost,
  place: { from: number; to: number; scale: number; minLength?: number },
  level = 0.95,
): { change: number; low: number; high: number } {
  const { from, to, scale, minLength = 1 } = place
  const first = from + minLength
  const last = to - minLength
  if (!(from >= 0 && to <= cost.length && first <= last))
    throw new InputError('OUT_OF_RANGE', `to: expected room for two segments, got [${from}, ${to})`)
  if (!(scale >= 0)) throw new InputError('OUT_OF_RANGE', `scale: expected >= 0, got ${scale}`)
  const total = new Float64Array(last - first + 1)
  let best = 0
  for (let k = 0; k < total.length; k++) {
    total[k] = cost.of(from, first + k) + cost.of(first + k, to)
    if (total[k]! < total[best]!) best = k
  }
  const most = total[best]! - 2 * Math.log(1 - Math.sqrt(level)) * scale
  let low = best
  let high = best
  for (let k = 0; k < total.length; k++) {
    if (total[k]! > most) continue
    low = Math.min(low, k)
    high = Math.max(high, k)
  }
  return { change: first + best, low: first + low, high: first + high }
}

/** A partition that is best from some penalty on, up to that of the next one. */
export interface PenaltyStep extends ChangePoints {
  readonly fromPenalty: number
}

/**
 * All partitions that are best for some penalty in a range, without trying each penalty.
 *
 * @param range.from, range.to  0 <= from < to.
 * @returns by rising penalty, that is by falling number of changes; the first starts at `from`.
 * @throws InputError OUT_OF_RANGE
 * @source Haynes, Eckley & Fearnhead (2017), Computationally efficient changepoint detection for a range of penalties,
 *   Journal of Computational and Graphical Statistics 26, 134-143.
 */
export function penaltyPath(
  cost: SegmentCost,
  range: { from: number; to: number; minLength?: number },
): PenaltyStep[] {
  const { from, to, minLength = 1 } = range
  if (!(from >= 0 && to > from))
    throw new InputError('OUT_OF_RANGE', `to: expected above from >= 0, got ${from} to ${to}`)
  const at = (penalty: number): ChangePoints => changePoints(cost, { penalty, minLength })
  const found = new Map<number, ChangePoints>()
  const between = (many: ChangePoints, few: ChangePoints): void => {
    found.set(many.changes.length, many)
    found.set(few.changes.length, few)
    if (many.changes.length <= few.changes.length + 1) return
    const middle = at(crossing(many, few))
    // As good as both at the crossing: a partition of another size is another answer, else the two meet there.
    if (found.has(middle.changes.length)) return
    between(many, middle)
    between(middle, few)
  }
  between(at(from), at(to))
  const ordered = [...found.values()].sort((a, b) => b.changes.length - a.changes.length)
  return ordered.map((step, i) => ({
    ...step,
    fromPenalty: i === 0 ? from : crossing(ordered[i - 1]!, step),
  }))
}

/** The penalty at which two partitions are equally good. */
function crossing(many: ChangePoints, few: ChangePoints): number {
  return (few.cost - many.cost) / (many.changes.length - few.changes.length)
}

/** Sums of values and squares about the mean of all, so that squares of a large level do not drown the differences. */
function centredSums(values: ArrayLike<number>): { sum: Float64Array; squares: Float64Array } {
  const n = values.length
  const total = prefixSums('values', values)[n]!
  const mean = n > 0 ? total / n : 0
  const sum = new Float64Array(n + 1)
  const squares = new Float64Array(n + 1)
  for (let i = 0; i < n; i++) {
    const value = values[i]! - mean
    sum[i + 1] = sum[i]! + value
    squares[i + 1] = squares[i]! + value * value
  }
  return { sum, squares }
}

function prefixSums(name: string, values: ArrayLike<number>): Float64Array {
  const sum = new Float64Array(values.length + 1)
  for (let i = 0; i < values.length; i++) {
    if (!Number.isFinite(values[i]!))
      throw new InputError('OUT_OF_RANGE', `${name}[${i}]: expected a finite number, got ${values[i]!}`)
    sum[i + 1] = sum[i]! + values[i]!
  }
  return sum
}
