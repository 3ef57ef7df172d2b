import { circularMean } from './circular-mean.ts'

export interface RayleighTest {
  /** n times the squared resultant length, no unit. */
  readonly z: number
  /** Probability of a resultant at least this long for directions without preference, 0 to 1. */
  readonly p: number
}

/**
 * Rayleigh's test of directions without preference against one preferred direction. The angles must be independent; rows
 * of a log are not, so there p comes out far too small.
 *
 * @param anglesDeg  degrees, any turn; not finite = missing
 * @returns z and p; both NaN when nothing is known. The series in 1/n that is often used for p falls below 0 for few and
 *   concentrated angles; this form cannot leave [0, 1].
 * @source Wilkie (1983), Rayleigh test for randomness of circular data; Zar (2010), eq. 27.4:
 *   p = exp(sqrt(1 + 4 n + 4 (n^2 - R^2)) - (1 + 2 n)) with R = n times the resultant length
 */
export function rayleighTest(anglesDeg: ArrayLike<number>): RayleighTest {
  const { resultant, count } = circularMean(anglesDeg)
  const length = count * resultant
  const root = Math.sqrt(1 + 4 * count + 4 * (count - length) * (count + length))
  // The exponent as one quotient: the difference of the two large numbers would lose digits as n grows.
  return { z: count * resultant * resultant, p: Math.exp((-4 * length * length) / (root + 1 + 2 * count)) }
}
