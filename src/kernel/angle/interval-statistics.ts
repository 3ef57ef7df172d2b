import { circularMean } from './circular-mean.ts'
import { RAD_PER_DEG } from './radians.ts'
import { yamartinoSigma } from './yamartino-sigma.ts'

export interface IntervalStatistics {
  /** Unit-vector mean, degrees, [0, 360); NaN when nothing is known or the samples cancel. */
  readonly direction: number
  /** Yamartino's sigma, degrees; NaN when nothing is known. */
  readonly sigma: number
  readonly resultant: number
  readonly count: number
}

/**
 * What a logger would have stored of one interval's samples: unit-vector mean and Yamartino's sigma. Neither asks anything of the
 * sampling rate, unlike {@link mitsutaStatistics}.
 *
 * @param samplesDeg  degrees, any turn; not finite = missing
 * @example intervalStatistics([350, 10]).direction // 0
 */
export function intervalStatistics(samplesDeg: ArrayLike<number>): IntervalStatistics {
  const { direction, resultant, count } = circularMean(samplesDeg)
  // Sigma depends on the length of the mean vector alone, so any direction will do where there is none.
  const angle = Number.isNaN(direction) ? 0 : direction * RAD_PER_DEG
  const sigma = yamartinoSigma(resultant * Math.sin(angle), resultant * Math.cos(angle))
  return { direction, sigma, resultant, count }
}
