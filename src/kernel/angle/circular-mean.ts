import { InputError } from '../../errors.ts'
import { DEG_PER_RAD, RAD_PER_DEG } from './radians.ts'
import { wrap360 } from './wrap.ts'

/** Rounding alone leaves about 1e-15 where angles cancel, more where millions are summed. */
export const MIN_RESULTANT = 1e-12

/** Sums may come from sines and cosines that were rounded: more than this above 1 is no rounding. */
const RESULTANT_SLACK = 1e-6

export interface CircularMean {
  /** Degrees, [0, 360); NaN when nothing is known or the angles cancel. */
  readonly direction: number
  /** Length of the mean unit vector, no unit, 0 to 1; NaN when nothing is known. */
  readonly resultant: number
  /** Angles that were used. */
  readonly count: number
}

/**
 * Mean direction of angles, so that 350 and 10 give 0 and not 180. It is also the unit-vector mean of an interval.
 *
 * @param anglesDeg  degrees, any turn; length n. Not finite = missing: the pair is skipped.
 * @param weights    no unit, >= 0; length n; NaN = missing: the pair is skipped; default 1 each.
 * @returns direction, resultant length (at most 1) and pairs used. No pair, or zero total weight: direction and
 *   resultant NaN. Angles that cancel (resultant up to 1e-12): direction NaN.
 * @throws InputError LENGTH_MISMATCH, NEGATIVE_WEIGHT, OUT_OF_RANGE (infinite weight)
 * @source Mardia & Jupp (2000), Directional Statistics, eq. 2.2.4; here with weights.
 * @example circularMean([0, 90], [1, 0]).direction // 0
 */
export function circularMean(anglesDeg: ArrayLike<number>, weights?: ArrayLike<number>): CircularMean {
  if (weights && weights.length !== anglesDeg.length) {
    throw new InputError(
      'LENGTH_MISMATCH',
      `weights: expected ${anglesDeg.length} values, got ${weights.length}`,
    )
  }
  let sumSin = 0
  let sumCos = 0
  let total = 0
  let count = 0
  for (let i = 0; i < anglesDeg.length; i++) {
    const angle = anglesDeg[i]!
    const weight = weights === undefined ? 1 : weights[i]!
    if (!Number.isFinite(angle) || Number.isNaN(weight)) continue
    if (!(weight >= 0)) throw new InputError('NEGATIVE_WEIGHT', `weights[${i}]: expected >= 0, got ${weight}`)
    if (!(weight < Infinity)) {
      throw new InputError('OUT_OF_RANGE', `weights[${i}]: expected a finite number, got ${weight}`)
    }
    sumSin += weight * Math.sin(angle * RAD_PER_DEG)
    sumCos += weight * Math.cos(angle * RAD_PER_DEG)
    total += weight
    count++
  }
  return meanOfSums(sumSin, sumCos, total, count)
}

/**
 * Mean direction from sums that were made elsewhere (in a query, or over the rows of an interval).
 *
 * @param sumSin  sum of the sines of the angles, no unit
 * @param sumCos  sum of their cosines
 * @param count   how many angles; 0 gives NaN for direction and resultant
 * @returns as {@link circularMean}; a NaN sum gives NaN.
 * @throws InputError OUT_OF_RANGE for a count that is no whole number >= 0, or sums that so many angles cannot have
 * @example unitVectorMean(1, 1, 2).direction // 45
 */
export function unitVectorMean(sumSin: number, sumCos: number, count: number): CircularMean {
  if (!(Number.isInteger(count) && count >= 0)) {
    throw new InputError('OUT_OF_RANGE', `count: expected a whole number >= 0, got ${count}`)
  }
  if (Math.hypot(sumSin, sumCos) > count * (1 + RESULTANT_SLACK)) {
    throw new InputError(
      'OUT_OF_RANGE',
      `sumSin, sumCos: expected a vector no longer than ${count}, got (${sumSin}, ${sumCos})`,
    )
  }
  return meanOfSums(sumSin, sumCos, count, count)
}

/**
 * Length of the mean unit vector, no unit, 0 (spread out or cancelling) to 1 (all alike); NaN when nothing is known.
 * Arguments and errors as {@link circularMean}.
 *
 * @example resultantLength([12, 12, 372]) // 1
 */
export function resultantLength(anglesDeg: ArrayLike<number>, weights?: ArrayLike<number>): number {
  return circularMean(anglesDeg, weights).resultant
}

function meanOfSums(sumSin: number, sumCos: number, total: number, count: number): CircularMean {
  const resultant = total > 0 ? Math.min(1, Math.hypot(sumSin, sumCos) / total) : NaN
  const direction = resultant > MIN_RESULTANT ? wrap360(Math.atan2(sumSin, sumCos) * DEG_PER_RAD) : NaN
  return { direction, resultant, count }
}
