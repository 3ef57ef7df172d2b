import { InputError } from '../../errors.ts'
import { circularMean } from './circular-mean.ts'
import { wrap180 } from './wrap.ts'

/**
 * Quantiles about the mean direction: the circle is cut opposite the mean, the differences to the mean, in [-180, 180),
 * are taken as numbers on a line, and their quantiles (type 7, linear between order statistics, as in R's `quantile`) are
 * put back on the circle. R's package `circular` cuts opposite the median instead, which matters only when angles lie
 * between the two cuts; then the half-quantile here is not the {@link circularMedian} either.
 *
 * @param anglesDeg      degrees, any turn; not finite = missing
 * @param probabilities  0 to 1
 * @returns degrees, [-180, 180), one for each probability; NaN when nothing is known or the angles cancel.
 * @throws InputError OUT_OF_RANGE for a probability outside 0 to 1
 * @source Hyndman & Fan (1996), Sample Quantiles in Statistical Packages, definition 7
 * @example Array.from(circularQuantiles([350, 0, 10], [0, 0.75])) // [-10, 5]
 */
export function circularQuantiles(
  anglesDeg: ArrayLike<number>,
  probabilities: ArrayLike<number>,
): Float64Array<ArrayBuffer> {
  for (let i = 0; i < probabilities.length; i++) {
    const probability = probabilities[i]!
    if (!(probability >= 0 && probability <= 1)) {
      throw new InputError('OUT_OF_RANGE', `probabilities[${i}]: expected 0 to 1, got ${probability}`)
    }
  }
  const quantiles = new Float64Array(probabilities.length).fill(NaN)
  const { direction, count } = circularMean(anglesDeg)
  if (Number.isNaN(direction)) return quantiles

  const differences = new Float64Array(count)
  let used = 0
  for (let i = 0; i < anglesDeg.length; i++) {
    const angle = anglesDeg[i]!
    if (Number.isFinite(angle)) differences[used++] = wrap180(angle - direction)
  }
  differences.sort()
  for (let i = 0; i < probabilities.length; i++) {
    const rank = probabilities[i]! * (count - 1)
    const below = Math.floor(rank)
    const low = differences[below]!
    const high = differences[Math.min(below + 1, count - 1)]!
    quantiles[i] = wrap180(direction + low + (rank - below) * (high - low))
  }
  return quantiles
}
