import { InputError } from '../../errors.ts'
import { centredMoments } from './centred-moments.ts'
import { DEG_PER_RAD } from './radians.ts'

/**
 * Circular variance 1 - R, no unit, 0 to 1. (Some books call 2 (1 - R) by this name.) NaN when nothing is known.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @source Fisher (1993), Statistical Analysis of Circular Data, sec. 2.3
 * @example circularVariance([40, 400]) // 0
 */
export function circularVariance(anglesDeg: ArrayLike<number>): number {
  return centredMoments(anglesDeg).variance
}

/**
 * Circular standard deviation sqrt(-2 ln R), degrees, 0 to Infinity (angles that cancel). It takes the place of the
 * standard deviation of a wrapped normal; divisor n, so nothing is corrected for small n. NaN when nothing is known.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @source Fisher (1993), sec. 2.3; Zar's s0
 * @example circularSd([0, 180]) // Infinity
 */
export function circularSd(anglesDeg: ArrayLike<number>): number {
  const { direction, variance, count } = centredMoments(anglesDeg)
  if (count > 0 && Number.isNaN(direction)) return Infinity
  return DEG_PER_RAD * Math.sqrt(Math.max(0, -2 * Math.log1p(-variance)))
}

/**
 * Angular deviation sqrt(2 (1 - R)), degrees, 0 to 81.03. NaN when nothing is known.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @source Batschelet (1981); Zar's s
 */
export function angularDeviation(anglesDeg: ArrayLike<number>): number {
  return DEG_PER_RAD * Math.sqrt(2 * centredMoments(anglesDeg).variance)
}

/**
 * Circular standard deviation, degrees, from a resultant length, for sums that were made elsewhere. Rounding of R near 1
 * leaves about 1e-6 degrees of it; {@link circularSd} does not suffer from that.
 *
 * @param resultant  no unit, 0 to 1; 0 gives Infinity; above 1 (rounding) counts as 1; NaN gives NaN
 * @throws InputError OUT_OF_RANGE below 0
 * @example circularSdFromResultant(1) // 0
 */
export function circularSdFromResultant(resultant: number): number {
  return DEG_PER_RAD * Math.sqrt(Math.max(0, -2 * Math.log(checkedResultant(resultant))))
}

/**
 * Angular deviation, degrees, from a resultant length.
 *
 * @param resultant  no unit, 0 to 1; above 1 (rounding) counts as 1; NaN gives NaN
 * @throws InputError OUT_OF_RANGE below 0
 */
export function angularDeviationFromResultant(resultant: number): number {
  return DEG_PER_RAD * Math.sqrt(2 * (1 - checkedResultant(resultant)))
}

function checkedResultant(resultant: number): number {
  if (resultant < 0) throw new InputError('OUT_OF_RANGE', `resultant: expected 0 to 1, got ${resultant}`)
  return Math.min(1, resultant)
}
