import { centredMoments } from './centred-moments.ts'

/** Angles closer together than about 1e-8 degrees have no shape: what is left is rounding. */
const MIN_VARIANCE = 1e-20

/**
 * Circular dispersion (1 - rho2) / (2 R^2), no unit, with rho2 the length of the second trigonometric moment (not its
 * cosine about the mean, which some programs use and which is smaller for skewed data). For angles close together it is
 * the variance in square radians. NaN when nothing is known or the angles cancel.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @source Fisher (1993), sec. 2.3
 */
export function circularDispersion(anglesDeg: ArrayLike<number>): number {
  const { variance, halfSineFourth, halfSineSkew } = centredMoments(anglesDeg)
  // cos 2d = 1 - 8 h (1 - h); the mean of sin d is 0, so that of sin 2d is -4 times the mean of h sin d.
  const cosineDeficit = 4 * variance - 8 * halfSineFourth
  const sine = -4 * halfSineSkew
  const secondLength = Math.hypot(1 - cosineDeficit, sine)
  const deficit = (cosineDeficit * (2 - cosineDeficit) - sine * sine) / (1 + secondLength) // 1 - rho2
  return Math.max(0, deficit) / (2 * (1 - variance) ** 2)
}

/**
 * Circular skewness rho2 sin(mu2 - 2 mu) / (1 - R)^(3/2), no unit; 0 for symmetric data. Its sign is opposite to the usual
 * one: a long tail clockwise of the mean gives a negative number. NaN for fewer than two different angles and where the
 * angles cancel.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @source Fisher (1993), sec. 2.3; Pewsey, Neuhaeuser & Ruxton (2013), Circular Statistics in R, ch. 3
 */
export function circularSkewness(anglesDeg: ArrayLike<number>): number {
  const { variance, halfSineSkew } = centredMoments(anglesDeg)
  return variance > MIN_VARIANCE ? (-4 * halfSineSkew) / variance ** 1.5 : NaN
}

/**
 * Circular kurtosis (rho2 cos(mu2 - 2 mu) - R^4) / (1 - R)^2, no unit; 0 for a wrapped normal. NaN for fewer than two
 * different angles and where the angles cancel.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @source Fisher (1993), sec. 2.3; Pewsey, Neuhaeuser & Ruxton (2013), ch. 3
 */
export function circularKurtosis(anglesDeg: ArrayLike<number>): number {
  const { variance, halfSineFourth } = centredMoments(anglesDeg)
  if (!(variance > MIN_VARIANCE)) return NaN
  // The definition with its numerator expanded in h: 8 mean(h^2) - 6 V^2 + 4 V^3 - V^4.
  return (8 * halfSineFourth) / (variance * variance) - 6 + 4 * variance - variance * variance
}
