import { InputError } from '../../errors.ts'

/** From here on the asymptotic series is exact to the last digit after a dozen terms. */
export const LARGE_KAPPA = 50

/** Enough for the recurrence to forget its start below LARGE_KAPPA: it shrinks the error by exp(-order^2 / kappa). */
const START_ORDER = 64

/** Below this the next term of the power series is lost in rounding. */
const SMALL_KAPPA = 1e-8

const MAX_TERMS = 60

/**
 * Bessel ratio A_p(kappa) = I_p(kappa) / I_0(kappa), no unit, [0, 1]: the mean of cos(p g) for a von Mises angle g about 0.
 * A_1 is its resultant length, A_3 the mean of cos 3g.
 *
 * @param kappa  concentration, no unit, 0 to Infinity; NaN gives NaN
 * @param order  p: 1, 2 or 3
 * @throws InputError OUT_OF_RANGE for kappa < 0 or another order
 * @source Mardia & Jupp (2000), sec. 3.5.4; recurrence and large-argument series: Abramowitz & Stegun (1964), eq. 9.6.26
 *   and 9.7.1
 * @example besselRatio(0) // 0
 */
export function besselRatio(kappa: number, order: 1 | 2 | 3 = 1): number {
  if (kappa < 0) throw new InputError('OUT_OF_RANGE', `kappa: expected >= 0, got ${kappa}`)
  // Callers without types can pass any number.
  if (!([1, 2, 3] as number[]).includes(order)) {
    throw new InputError('OUT_OF_RANGE', `order: expected 1, 2 or 3, got ${String(order)}`)
  }
  if (Number.isNaN(kappa)) return NaN
  if (kappa < SMALL_KAPPA) return (kappa / 2) ** order / (order === 3 ? 6 : order)
  if (kappa >= LARGE_KAPPA) return largeSeries(kappa, order) / largeSeries(kappa, 0)

  // I_v / I_(v-1) = 1 / (2 v / kappa + I_(v+1) / I_v), downwards: all terms positive, so nothing cancels.
  let ratio = 0
  let product = 1
  for (let v = START_ORDER; v >= 1; v--) {
    ratio = 1 / ((2 * v) / kappa + ratio)
    if (v <= order) product *= ratio
  }
  return product
}

/**
 * 1 - A_1(kappa) without the digits that the subtraction would lose, for kappa >= LARGE_KAPPA.
 * About 1 / (2 kappa).
 */
export function besselRatioDeficit(kappa: number): number {
  let order0 = 1
  let order1 = 1
  let numerator = 0
  let denominator = 1
  for (let k = 1; k <= MAX_TERMS; k++) {
    order0 *= seriesFactor(kappa, 0, k)
    order1 *= seriesFactor(kappa, 1, k)
    numerator += order0 - order1
    denominator += order0
    if (Math.abs(order0 - order1) <= Number.EPSILON * 0.01 * numerator) break
  }
  return numerator / denominator
}

/** I_p(kappa) sqrt(2 pi kappa) exp(-kappa). */
function largeSeries(kappa: number, order: number): number {
  let term = 1
  let sum = 1
  for (let k = 1; k <= MAX_TERMS; k++) {
    term *= seriesFactor(kappa, order, k)
    sum += term
    if (Math.abs(term) <= Number.EPSILON * 0.01) break
  }
  return sum
}

function seriesFactor(kappa: number, order: number, k: number): number {
  return ((2 * k - 1) ** 2 - 4 * order * order) / (8 * k * kappa)
}
