import { circularMean } from './circular-mean.ts'
import { RAD_PER_DEG } from './radians.ts'
import { wrap180 } from './wrap.ts'

export interface CentredMoments {
  readonly direction: number
  readonly count: number
  /** 1 - R. */
  readonly variance: number
  /** Mean of h^2, with h = sin^2(d / 2) and d the angle less the mean direction; NaN without a direction. */
  readonly halfSineFourth: number
  /** Mean of h sin d; NaN without a direction. */
  readonly halfSineSkew: number
}

/**
 * The sums behind spread and shape, taken about the mean direction. 1 - R, 1 - rho2 and the numerator of the kurtosis
 * are small differences of numbers near 1 when angles lie close together; written in h they lose no digits.
 */
export function centredMoments(anglesDeg: ArrayLike<number>): CentredMoments {
  const { direction, resultant, count } = circularMean(anglesDeg)
  if (Number.isNaN(direction)) {
    return { direction, count, variance: 1 - resultant, halfSineFourth: NaN, halfSineSkew: NaN }
  }
  let sumH = 0
  let sumHH = 0
  let sumHSin = 0
  for (let i = 0; i < anglesDeg.length; i++) {
    const angle = anglesDeg[i]!
    if (!Number.isFinite(angle)) continue
    const half = 0.5 * RAD_PER_DEG * wrap180(angle - direction)
    const sine = Math.sin(half)
    const h = sine * sine
    sumH += h
    sumHH += h * h
    sumHSin += h * 2 * sine * Math.cos(half)
  }
  return {
    direction,
    count,
    variance: (2 * sumH) / count,
    halfSineFourth: sumHH / count,
    halfSineSkew: sumHSin / count,
  }
}
