import { signedDifference, wrap360 } from './wrap.ts'

export interface MitsutaStatistics {
  /** Scalar mean direction, degrees, [0, 360); NaN when nothing is known or a step was exactly half a turn. */
  readonly direction: number
  /** Standard deviation about that mean, divisor n, degrees; may pass 104 when the direction goes round. */
  readonly sd: number
  readonly count: number
  /** Largest step between successive known samples, degrees, 0 to 180; near 180 the result is not to be trusted. */
  readonly largestStep: number
}

/**
 * Mitsuta's single-pass scalar mean and standard deviation of a direction: the series is followed around the circle by its
 * steps, each taken the short way.
 *
 * Only for samples so close in time that successive ones differ by less than 180 degrees (1 Hz or faster). It must not be used to
 * combine means of minutes or of parts of an hour: nothing keeps those within half a turn of each other, and the result
 * then depends on their order. Use {@link unitVectorMean} or {@link circularMean} there.
 *
 * @param samplesDeg  degrees in order of time, any turn. Not finite = missing: the step runs from the last known sample.
 * @returns a step of exactly 180 has no short way: direction NaN, and sd takes that step as -180.
 * @source US EPA (2000), Meteorological Monitoring Guidance for Regulatory Modeling Applications, EPA-454/R-99-005,
 *   sec. 6.2.1; here with updated means in place of sums of squares, which lose digits
 * @example mitsutaStatistics([350, 355, 5, 10, 20]).direction // 4
 */
export function mitsutaStatistics(samplesDeg: ArrayLike<number>): MitsutaStatistics {
  let followed = 0
  let mean = 0
  let squares = 0
  let count = 0
  let largestStep = 0
  let last = NaN
  for (let i = 0; i < samplesDeg.length; i++) {
    const sample = samplesDeg[i]!
    if (!Number.isFinite(sample)) continue
    const step = count === 0 ? 0 : signedDifference(sample, last)
    followed = count === 0 ? sample : followed + step
    if (Math.abs(step) > largestStep) largestStep = Math.abs(step)
    last = sample
    count++
    const gap = followed - mean
    mean += gap / count
    squares += gap * (followed - mean)
  }
  if (count === 0) return { direction: NaN, sd: NaN, count, largestStep: NaN }
  return {
    direction: largestStep < 180 ? wrap360(mean) : NaN,
    sd: Math.sqrt(squares / count),
    count,
    largestStep,
  }
}
