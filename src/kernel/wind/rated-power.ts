import { hermiteValue } from './monotone-cubic.ts'
import type { MeasuredCurve } from './power-curve.ts'

/** Rows that a plateau must hold at least, as a number and as a share of all rows that produce. */
const LEAST_ROWS = 10
const LEAST_SHARE = 0.005
/** So many of the plateau's rows may lie above it as spikes. */
const MOST_SPIKES = 0.1
/** All widths are shares of the plateau's power, for a plateau with little noise. */
const WINDOW = 0.02
const SLOPE_FROM = 0.2
const SLOPE_TO = 0.08
const SPIKE = 0.1
const REFINE = 0.04
/**
 * How many times denser than the slope below it a plateau must be, and by what its widths are multiplied. A plateau with noise
 * of up to 10 % is looked for when no sharper one is found. Without a plateau the density falls all the way up.
 */
const PASSES = [
  { denser: 2.5, width: 1 },
  { denser: 1.5, width: 3 },
]
const REFINE_ROUNDS = 4
const BISECTIONS = 50

/**
 * Rated power as the data show it: the level of the upper plateau at which many rows pile up.
 *
 * A level is a plateau when within 2 % of it lie at least 10 rows and 0.5 % of all producing rows, 2.5 times denser than
 * between 80 and 92 % of it, and when the rows above 110 % of it (spikes) number at most a tenth of its own. Of several
 * the fullest counts, and the answer is the median of the rows within 4 % of it. High spikes do not move it. Where there is
 * none, a noisier one is looked for with three times these widths and 1.5 times the density; its median can lie 2 % low.
 *
 * @param powersKw  kW; any length. NaN, infinite and not positive values are skipped.
 * @returns kW. NaN when no plateau is to be seen, as in a month of little wind. A turbine held below its rating, or in
 *   steady wind, through the whole log shows the level at which it stayed: the rows cannot tell.
 */
export function ratedPowerFrom(powersKw: ArrayLike<number>): number {
  let count = 0
  const sorted = new Float64Array(powersKw.length)
  for (let i = 0; i < powersKw.length; i++) {
    const power = powersKw[i]!
    if (power > 0 && power < Infinity) sorted[count++] = power
  }
  const rows = sorted.subarray(0, count).sort()
  for (const { denser, width } of PASSES) {
    let level = fullestPlateau(rows, denser, width)
    if (Number.isNaN(level)) continue
    for (let round = 0; round < REFINE_ROUNDS; round++) {
      level = medianWithin(rows, level * (1 - REFINE * width), level * (1 + REFINE * width))
    }
    return level
  }
  return NaN
}

function fullestPlateau(rows: Float64Array, denser: number, width: number): number {
  const count = rows.length
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
    while (windowFrom < count && rows[windowFrom]! < power * (1 - WINDOW * width)) windowFrom++
    while (windowTo < count && rows[windowTo]! <= power * (1 + WINDOW * width)) windowTo++
    while (slopeFrom < count && rows[slopeFrom]! < power * (1 - SLOPE_FROM * width)) slopeFrom++
    while (slopeTo < count && rows[slopeTo]! < power * (1 - SLOPE_TO * width)) slopeTo++
    while (spikesFrom < count && rows[spikesFrom]! <= power * (1 + SPIKE * width)) spikesFrom++
    const inside = windowTo - windowFrom
    const below = ((slopeTo - slopeFrom) * 2 * WINDOW) / (SLOPE_FROM - SLOPE_TO)
    const spikes = count - spikesFrom
    if (inside > fullest && inside >= least && inside >= denser * below && spikes <= MOST_SPIKES * inside) {
      fullest = inside
      level = power
    }
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
