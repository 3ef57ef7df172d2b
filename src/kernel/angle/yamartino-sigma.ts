import { InputError } from '../../errors.ts'
import { DEG_PER_RAD } from './radians.ts'

/** Printed as 0.1547; with the exact number, directions without preference give 180 / sqrt(3), as they should. */
const CONSTANT = 2 / Math.sqrt(3) - 1

/** A mean unit vector may pass length 1 by the rounding of stored sines and cosines. */
const LENGTH_SLACK = 1e-6

/**
 * Yamartino's estimate of the standard deviation of a direction over an interval:
 * asin(eps) (1 + (2 / sqrt(3) - 1) eps^3), eps = sqrt(1 - meanSin^2 - meanCos^2).
 *
 * @param meanSin  mean of the sines over the interval, no unit
 * @param meanCos  mean of the cosines
 * @returns degrees, 0 to 103.93 (180 / sqrt(3), for directions without preference); NaN for a NaN mean. Within 2 % of the
 *   two-pass standard deviation of usual winds, 15 % too large for two opposite directions. Rounding leaves about 1e-6 degrees.
 * @throws InputError OUT_OF_RANGE for a mean vector longer than 1
 * @source Yamartino (1984), A comparison of several "single-pass" estimators of the standard deviation of wind direction,
 *   J. Climate Appl. Meteor. 23, 1362-1366
 * @example yamartinoSigma(0, 1) // 0
 */
export function yamartinoSigma(meanSin: number, meanCos: number): number {
  const square = meanSin * meanSin + meanCos * meanCos
  if (square > 1 + LENGTH_SLACK) {
    throw new InputError(
      'OUT_OF_RANGE',
      `meanSin, meanCos: expected a vector no longer than 1, got (${meanSin}, ${meanCos})`,
    )
  }
  const eps = Math.sqrt(Math.max(0, 1 - square))
  return DEG_PER_RAD * Math.asin(eps) * (1 + CONSTANT * eps ** 3)
}
