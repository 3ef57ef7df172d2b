/** Makes the median absolute deviation of normal values estimate their SD: 1 / Phi^-1(3/4). */
const MAD_TO_SD = 1.4826022185056018

/**
 * Median of the numbers in a Float64Array, by sorting a copy.
 *
 * @param values  NaN = missing, skipped.
 * @returns mean of the two middle values for an even count; NaN without any value.
 */
export function medianOf(values: ArrayLike<number>): number {
  return quantileOf(values, 0.5)
}

/**
 * Sample quantile, linear between order statistics at (n - 1) q (type 7 of Hyndman & Fan 1996).
 *
 * @param values  NaN = missing, skipped.
 * @param q       0 to 1.
 * @returns NaN without any value.
 */
export function quantileOf(values: ArrayLike<number>, q: number): number {
  const sorted = sortedKnown(values)
  if (sorted.length === 0) return NaN
  const position = (sorted.length - 1) * q
  const lower = Math.floor(position)
  const upper = Math.min(lower + 1, sorted.length - 1)
  return sorted[lower]! + (position - lower) * (sorted[upper]! - sorted[lower]!)
}

/**
 * Standard deviation as the median absolute deviation from the median tells it, so that a tenth of bad rows does not matter.
 *
 * @param values  NaN = missing, skipped.
 * @returns NaN without any value, 0 when more than half are equal.
 */
export function robustSd(values: ArrayLike<number>): number {
  const sorted = sortedKnown(values)
  const n = sorted.length
  if (n === 0) return NaN
  const centre = (sorted[(n - 1) >> 1]! + sorted[n >> 1]!) / 2
  // The deviations are already in order on either side of the centre: walk outwards to their middle.
  let right = n >> 1
  while (right > 0 && sorted[right - 1]! >= centre) right--
  let left = right - 1
  let before = 0
  let last = 0
  for (let taken = 0; taken <= n >> 1; taken++) {
    const toLeft = left >= 0 ? centre - sorted[left]! : Infinity
    const toRight = right < n ? sorted[right]! - centre : Infinity
    before = last
    if (toLeft <= toRight) {
      last = toLeft
      left--
    } else {
      last = toRight
      right++
    }
  }
  return MAD_TO_SD * (n % 2 === 1 ? last : (before + last) / 2)
}

function sortedKnown(values: ArrayLike<number>): Float64Array {
  const known = new Float64Array(values.length)
  let n = 0
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!
    if (!Number.isNaN(value)) known[n++] = value
  }
  return known.subarray(0, n).sort()
}

/**
 * Huber's weight: 1 up to `cut` standard deviations, cut / |z| beyond.
 *
 * @param standardised  residual over its standard deviation.
 * @source Huber (1964), Robust estimation of a location parameter; cut 1.345 keeps 95 % efficiency under normal errors.
 */
export function huberWeight(standardised: number, cut = 1.345): number {
  const size = Math.abs(standardised)
  return size <= cut ? 1 : cut / size
}

/**
 * Tukey's biweight: (1 - (z / cut)^2)^2 inside `cut` standard deviations, 0 beyond.
 *
 * @source Beaton & Tukey (1974); cut 4.685 keeps 95 % efficiency under normal errors.
 */
export function biweight(standardised: number, cut = 4.685): number {
  const ratio = standardised / cut
  return Math.abs(ratio) < 1 ? (1 - ratio * ratio) ** 2 : 0
}

/**
 * By how much estimates spread more than a regression with the final robust weights held fixed says: a row that moves
 * outwards also loses weight. Sum of w x^2 over sum of psi' x^2, with psi = w(z) z the score and psi' its derivative.
 *
 * @param standardised  residuals over their standard deviation; length n. x: the regressor; length n.
 * @param weightOf  {@link huberWeight} or {@link biweight}
 * @returns >= 1 for these weights; 1 where nothing is known.
 * @source Huber & Ronchetti (2009), Robust Statistics, 2nd ed., section 7.6: asymptotic variance of M-estimates of regression.
 */
export function robustStretch(
  standardised: Float64Array,
  x: Float64Array,
  weightOf: (standardised: number) => number,
): number {
  const step = 1e-4
  let weights = 0
  let slopes = 0
  for (let i = 0; i < x.length; i++) {
    const z = standardised[i]!
    const square = x[i]! * x[i]!
    weights += weightOf(z) * square
    slopes += ((weightOf(z + step) * (z + step) - weightOf(z - step) * (z - step)) / (2 * step)) * square
  }
  return slopes > 0 && weights > slopes ? weights / slopes : 1
}
