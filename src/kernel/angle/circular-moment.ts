import { InputError } from '../../errors.ts'
import { MIN_RESULTANT } from './circular-mean.ts'
import { DEG_PER_RAD, RAD_PER_DEG } from './radians.ts'
import { wrap360 } from './wrap.ts'

export interface CircularMoment {
  /** Degrees, [0, 360); NaN when nothing is known or the multiples cancel. */
  readonly direction: number
  /** No unit, 0 to 1; NaN when nothing is known. */
  readonly length: number
  readonly count: number
}

/**
 * Trigonometric moment about zero: direction and length of the mean unit vector of p times the angles. p = 1 is
 * the mean direction with the resultant length; p = 2 serves axes and dispersion.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @param order      p, a whole number >= 1
 * @throws InputError OUT_OF_RANGE for another order
 * @source Fisher (1993), sec. 2.3
 * @example circularMoment([10, 190], 2).direction // 20
 */
export function circularMoment(anglesDeg: ArrayLike<number>, order: number): CircularMoment {
  if (!(Number.isInteger(order) && order >= 1)) {
    throw new InputError('OUT_OF_RANGE', `order: expected a whole number >= 1, got ${order}`)
  }
  let sumSin = 0
  let sumCos = 0
  let count = 0
  for (let i = 0; i < anglesDeg.length; i++) {
    const angle = order * anglesDeg[i]! * RAD_PER_DEG
    if (!Number.isFinite(angle)) continue
    sumSin += Math.sin(angle)
    sumCos += Math.cos(angle)
    count++
  }
  const length = count > 0 ? Math.min(1, Math.hypot(sumSin, sumCos) / count) : NaN
  const direction = length > MIN_RESULTANT ? wrap360(Math.atan2(sumSin, sumCos) * DEG_PER_RAD) : NaN
  return { direction, length, count }
}
