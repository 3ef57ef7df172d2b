import { circularMean } from './circular-mean.ts'
import { signedDifference, wrap360 } from './wrap.ts'

/** Angles closer than this are one angle, and arcs whose mean distance differs by less tie: rounding, not data (degrees). */
const SAME_DEG = 1e-9

/**
 * Circular median: the direction from which the mean angular distance to the angles, each 0 to 180, is least. For an odd
 * number it is one of the angles; where a whole arc does equally well it is the middle of that arc, as the usual median
 * of an even number is. (R's package `circular` averages instead every angle that ties, so it gives 89.67 where this gives
 * 90.5 for 88, 88 and 93 in the middle.)
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @returns degrees, [0, 360). Of several arcs that tie, the one nearest the mean direction. NaN when nothing is known,
 *   when every direction does equally well (0, 180), or when the mean direction does not decide (0, 120, 240).
 *   Time n log n, memory about five numbers for each angle.
 * @source Fisher (1993), sec. 2.3.2; Mardia & Jupp (2000), sec. 2.2.2
 * @example circularMedian([350, 20, 5]) // 5
 * @example circularMedian([350, 20]) // 5
 */
export function circularMedian(anglesDeg: ArrayLike<number>): number {
  const sorted = sortedOnCircle(anglesDeg)
  if (sorted.length === 0) return NaN
  const kinks = kinksOfDistance(sorted)
  const arcs = lowestArcs(kinks, SAME_DEG * sorted.length)
  if (arcs.length === 1) return arcs[0]!

  const { direction } = circularMean(sorted)
  let nearest = NaN
  let nearestGap = Infinity
  for (const arc of arcs) {
    const gap = Math.abs(signedDifference(arc, direction))
    if (gap < nearestGap - SAME_DEG) {
      nearest = arc
      nearestGap = gap
    } else if (gap <= nearestGap + SAME_DEG) {
      nearest = NaN // two arcs equally near
      nearestGap = Math.min(gap, nearestGap)
    }
  }
  return nearest
}

/**
 * Mean deviation: mean angular distance from the circular median, degrees, 0 to 90. NaN when nothing is known. Without
 * one median (see {@link circularMedian}) the arcs that tie have this same least distance, yet NaN is given, so that the
 * two numbers always belong together.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @source Fisher (1993), sec. 2.3
 * @example meanDeviation([350, 0, 40]) // 16.666666666666668
 */
export function meanDeviation(anglesDeg: ArrayLike<number>): number {
  const median = circularMedian(anglesDeg)
  let sum = 0
  let count = 0
  for (let i = 0; i < anglesDeg.length; i++) {
    const angle = anglesDeg[i]!
    if (!Number.isFinite(angle)) continue
    sum += Math.abs(signedDifference(angle, median))
    count++
  }
  return sum / count
}

function sortedOnCircle(anglesDeg: ArrayLike<number>): Float64Array {
  const sorted = new Float64Array(anglesDeg.length)
  let count = 0
  for (let i = 0; i < anglesDeg.length; i++) {
    const angle = anglesDeg[i]!
    if (Number.isFinite(angle)) sorted[count++] = wrap360(angle)
  }
  return sorted.subarray(0, count).sort()
}

interface Kinks {
  readonly count: number
  /** Where the summed distance changes its slope, degrees, increasing, over less than one turn. */
  readonly position: Float64Array
  /** Slope from there to the next kink: angles passed within half a turn less angles still ahead. */
  readonly slope: Float64Array
}

/** The summed distance is straight between kinks: one at each angle (slope + 2) and one opposite it (slope - 2). */
function kinksOfDistance(sorted: Float64Array): Kinks {
  const n = sorted.length
  const position = new Float64Array(2 * n)
  const slope = new Float64Array(2 * n)
  // Opposite points in order: those of angles from 180 up come first, as angle - 180.
  let upper = 0
  while (upper < n && sorted[upper]! < 180) upper++
  let angles = 0
  let opposites = 0
  let count = 0
  let running = 0
  while (angles < n || opposites < n) {
    const here = angles < n ? sorted[angles]! : Infinity
    const there = opposites < n ? oppositeAt(sorted, upper, opposites) : Infinity
    const at = Math.min(here, there)
    running += here <= there ? 2 : -2
    if (here <= there) angles++
    else opposites++
    if (count > 0 && at - position[count - 1]! < SAME_DEG) {
      slope[count - 1] = running
      continue
    }
    position[count] = at
    slope[count] = running
    count++
  }
  // 359.9999999999 and 0 are one place too.
  if (count > 1 && position[0]! + 360 - position[count - 1]! < SAME_DEG) count--

  // The slopes are known but for a constant; over a whole turn the distance comes back to where it was.
  let climb = 0
  for (let i = 0; i < count; i++) climb += slope[i]! * (nextPosition(position, count, i) - position[i]!)
  const constant = Math.round(-climb / 360)
  for (let i = 0; i < count; i++) slope[i]! += constant
  return { count, position, slope }
}

function oppositeAt(sorted: Float64Array, upper: number, index: number): number {
  const fromUpper = upper + index
  return fromUpper < sorted.length ? sorted[fromUpper]! - 180 : sorted[fromUpper - sorted.length]! + 180
}

function nextPosition(position: Float64Array, count: number, index: number): number {
  return index + 1 < count ? position[index + 1]! : position[0]! + 360
}

/** Middles, degrees [0, 360), of the arcs where the summed distance is least; empty when it is the same all round. */
function lowestArcs({ count, position, slope }: Kinks, tolerance: number): number[] {
  let start = 0 // a kink that ends a slope, so that no flat stretch is cut in two
  while (start < count && slope[start === 0 ? count - 1 : start - 1] === 0) start++
  if (start === count) return []
  let middles: number[] = []
  let levels: number[] = []
  let level = 0
  let lowest = Infinity
  let before = slope[start === 0 ? count - 1 : start - 1]!
  let arcFrom = NaN
  for (let step = 0; step < count; step++) {
    const index = (start + step) % count
    const after = slope[index]!
    const at = position[index]! + (start + step >= count ? 360 : 0)
    if (Number.isNaN(arcFrom)) arcFrom = at
    if (after === 0) continue
    // Only a kink or flat arc between falling and rising can be lowest: on a slope of many angles neighbours tie within rounding.
    if (before < 0 && after > 0 && level <= lowest + tolerance) {
      if (level < lowest - tolerance) {
        middles = []
        levels = []
      }
      lowest = Math.min(lowest, level)
      middles.push(wrap360((arcFrom + at) / 2))
      levels.push(level)
    }
    before = after
    arcFrom = NaN
    level += after * (nextPosition(position, count, index) - position[index]!)
  }
  return middles.filter((_, i) => levels[i]! <= lowest + tolerance)
}
