import {
  dayCells,
  dayCellSums,
  resampledSlopes,
  slopeWithinCells,
  type DayWeights,
} from '../../kernel/stats/index.ts'
import { asFitted, type OffsetFit } from './offset-fit.ts'
import type { OffsetRows } from './offset-rows.ts'
import { fewResamples, resampledHalfWidth } from './resampled-spread.ts'

/** The exponent that the bend of power against vane would make by itself. */
export interface FittedExponent {
  readonly exponent: number
  /** At 95 %, from the scatter between days alone. */
  readonly halfWidth: number
}

/**
 * The exponent from the curvature of power against vane: with d and p both free,
 *
 *     ln P = level + s (p/3) ln cos(v) - s (p/3) tan(d) tan(v) + noise
 *
 * p is the coefficient of s ln cos(v) / 3 beside that of s tan(v). A diagnostic and no estimate: vane noise that the rotor
 * does not feel flattens the bend, an anemometer whose reading bends with the vane adds to it, and the interval holds
 * neither (2.3 for a true 3, tightly, was seen).
 *
 * @returns null where the vane does not vary enough, or the fit did not settle.
 * @source least squares with the second regressor's share taken out of the first (Frisch & Waugh 1933).
 */
export function fittedExponent(
  rows: OffsetRows,
  fit: OffsetFit,
  dayWeights: readonly DayWeights[],
  usedDays: number,
): FittedExponent | null {
  if (!fit.converged) return null
  const bend = rows.vane.map((vane, i) => (rows.steepness[i]! / 3) * Math.log(Math.cos(vane)))
  const tilt = rows.vane.map((vane, i) => (rows.steepness[i]! / 3) * Math.tan(vane))
  const [whiteBend, whiteTilt, whiteY] = asFitted(rows, fit, [bend, tilt, rows.logRatio]) as [
    Float64Array,
    Float64Array,
    Float64Array,
  ]
  const layout = dayCells(rows.day, rows.cell, rows)
  const slopeOf = (x: Float64Array, y: Float64Array): number =>
    slopeWithinCells(dayCellSums(layout, x, y, fit.weight))
  const shared = slopeOf(whiteTilt, whiteBend)
  const ownBend = whiteBend.map((value, i) => value - shared * whiteTilt[i]!)
  const exponent = slopeOf(ownBend, whiteY)
  const tilted = slopeOf(whiteTilt, whiteY)
  if (Number.isNaN(exponent + tilted)) return null
  const left = whiteY.map((value, i) => value - exponent * ownBend[i]! - tilted * whiteTilt[i]!)
  const sums = dayCellSums(layout, ownBend, left, fit.weight)
  let half = NaN
  for (const weights of fewResamples(dayWeights)) {
    const next = resampledHalfWidth(resampledSlopes(sums, weights), weights, usedDays)
    if (!Number.isNaN(next) && !(half >= next)) half = next
  }
  return { exponent, halfWidth: half * fit.stretch }
}
