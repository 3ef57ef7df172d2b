import { hermiteValue } from './monotone-cubic.ts'
import type { MeasuredCurve } from './power-curve.ts'

/** Half-width of the window that looks for the plateau, as a share of its power. */
const WINDOW = 0.02
/** Rows that a plateau must hold at least, as a number and as a share of all rows that produce. */
const LEAST_ROWS = 10
const LEAST_SHARE = 0.005
/** The slope below a plateau, as shares of its power, and how many times denser the plateau must be. */
const SLOPE_FROM = 0.8
const SLOPE_TO = 0.92
const DENSER = 2.5
/** Power beyond this share of the plateau counts as a spike; so many of the plateau's rows may be spikes. */
const SPIKE = 1.1
const MOST_SPIKES = 0.1
/** Half-width of the window whose median is the answer: takes in the noise of the plateau on both sides. */
const REFINE = 0.04
const REFINE_ROUNDS = 4
const BISECTIONS = 50

/**
 * Rated power as the data show it: the level of the upper plateau at which many rows pile up.
 *
 * A level is a plateau when within 2 % of it lie at least 10 rows and 0.5 % of all producing rows, 2.5 times denser than
 * between 80 and 92 % of it, and when the rows above 110 % of it (spikes) number at most a tenth of its own. Of several
 * the fullest counts, and the answer is the median of the rows within 4 % of it. High spikes do not move it.
 *
 * @param powersKw  kW; any length. NaN, infinite and not positive values are skipped.
 * @returns kW. NaN when no plateau is to be seen, as in a month of little wind. A turbine held below its rating through the
 *   whole log shows the level at which it was held: the rows cannot tell.
 */
export function ratedPowerFrom(powersKw: ArrayLike<number>): number {
  let count = 0
  const sorted = new Float64Array(powersKw.length)
  for (let i = 0; i < powersKw.length; i++) {
    const power = powersKw[i]!
    if (power > 0 && power < Infinity) sorted[count++] = power
  }
  const rows = sorted.subarray(0, count).sort()
  const least = Math.max(LEAST_ROWS, LEAST_SHARE * count)
  let fullest = 0
  let level = NaN
  // Rows below each edge of the windows; all edges only move up as the level does.
  let windowFrom = 0
  let windowTo = 0
  let slopeFrom = 0
  let slopeTo = 0
  let spikesFrom = 0
  for (const power of rows) {
    while (windowFrom < count && rows[windowFrom]! < power * (1 - WINDOW)) windowFrom++
    while (windowTo < count && rows[windowTo]! <= power * (1 + WINDOW)) windowTo++
    while (slopeFrom < count && rows[slopeFrom]! < power * SLOPE_FROM) slopeFrom++
    while (slopeTo < count && rows[slopeTo]! < power * SLOPE_TO) slopeTo++
    while (spikesFrom < count && rows[spikesFrom]! <= power * SPIKE) spikesFrom++
    const inside = windowTo - windowFrom
    const below = ((slopeTo - slopeFrom) * 2 * WINDOW) / (SLOPE_TO - SLOPE_FROM)
    if (
      inside > fullest &&
      inside >= least &&
      inside >= DENSER * below &&
      count - spikesFrom <= MOST_SPIKES * inside
    ) {
      fullest = inside
      level = power
    }
  }
  for (let round = 0; round < REFINE_ROUNDS && !Number.isNaN(level); round++) {
    level = medianWithin(rows, level * (1 - REFINE), level * (1 + REFINE))
  }
  return level
}

/**
 * Speed at which a measured curve first reaches a share of rated power.
 *
 * @param ratedKw  kW, > 0.
 * @param share  no unit, > 0. Default 0.9.
 * @returns m/s. NaN when the curve does not reach it, when its first point is there already, or when an argument is NaN.
 */
export function kneeSpeed(curve: MeasuredCurve, ratedKw: number, share = 0.9): number {
  const { speedsMs, fittedKw, slopes } = curve
  const target = ratedKw * share
  const reached = fittedKw.findIndex((power) => power >= target)
  if (reached < 1) return NaN
  let low = speedsMs[reached - 1]!
  let high = speedsMs[reached]!
  for (let step = 0; step < BISECTIONS; step++) {
    const middle = (low + high) / 2
    if (hermiteValue(speedsMs, fittedKw, slopes, reached - 1, middle) >= target) high = middle
    else low = middle
  }
  return high
}

function medianWithin(sorted: Float64Array, low: number, high: number): number {
  let from = 0
  while (from < sorted.length && sorted[from]! < low) from++
  let to = sorted.length
  while (to > from && sorted[to - 1]! > high) to--
  const size = to - from
  return size > 0 ? (sorted[from + ((size - 1) >> 1)]! + sorted[from + (size >> 1)]!) / 2 : NaN
}
