import { quickselect } from 'simple-statistics'

/** Makes the median absolute deviation of normal values estimate their SD: 1 / Phi^-1(3/4). */
const MAD_TO_SD = 1.4826022185056018

/**
 * Median of the numbers in a Float64Array, selected in a copy.
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
  const known = knownOf(values)
  if (known.length === 0) return NaN
  return quantileWithin(known, q)
}

/**
 * Standard deviation as the median absolute deviation from the median tells it, so that a tenth of bad rows does not matter.
 *
 * @param values  NaN = missing, skipped.
 * @returns NaN without any value, 0 when more than half are equal.
 */
export function robustSd(values: ArrayLike<number>): number {
  const known = knownOf(values)
  if (known.length === 0) return NaN
  const centre = quantileWithin(known, 0.5)
  for (let i = 0; i < known.length; i++) known[i] = Math.abs(known[i]! - centre)
  return MAD_TO_SD * quantileWithin(known, 0.5)
}

function knownOf(values: ArrayLike<number>): Float64Array {
  const known = new Float64Array(values.length)
  let n = 0
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!
    if (!Number.isNaN(value)) known[n++] = value
  }
  return known.subarray(0, n)
}

/** Quantile of at least one number, none of them NaN; their order is lost. Selecting costs a fifth of sorting. */
function quantileWithin(numbers: Float64Array, q: number): number {
  const position = (numbers.length - 1) * q
  const lower = Math.floor(position)
  // Typed for arrays only; it exchanges entries by index alone.
  quickselect(numbers as unknown as number[], lower, 0, numbers.length - 1)
  const below = numbers[lower]!
  if (position === lower) return below
  // What lies to the right is no less: the next order statistic is the least of it.
  let above = Infinity
  for (let i = lower + 1; i < numbers.length; i++) if (numbers[i]! < above) above = numbers[i]!
  return below + (position - lower) * (above - below)
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
