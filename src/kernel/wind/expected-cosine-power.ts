import { InputError } from '../../errors.ts'
import { RAD_PER_DEG } from '../angle/index.ts'
import { cosineLaw } from './cosine-law.ts'
import { integrate } from './integrate.ts'

const HALF_PI = Math.PI / 2
/** Beyond this many standard deviations a normal density holds 2e-19 of its weight. */
const NORMAL_REACH = 9
/** A wrapped normal of this spread is uniform to 1e-34, so that a wider one need not be told from it. */
const WIDEST_SIGMA_RAD = 4 * Math.PI
/** A narrower spread changes the mean by less than 1e-16. */
const NARROWEST_SIGMA_RAD = 1e-9
/** A von Mises density is cut where it has fallen by exp(-42), 6e-19. */
const VON_MISES_REACH = 42

/**
 * Mean share of power left when the yaw error is spread normally about a standing misalignment: E max(cos g, 0)^p.
 *
 * Closed forms for p = 1, 2 and 3 while no more than 2e-19 of the weight lies beyond 90 degrees; else numerical
 * integration. Either is right to 1e-11.
 *
 * @param meanDeg  standing misalignment, degrees, either sign. NaN gives NaN.
 * @param sigmaDeg  dynamic yaw error as a standard deviation, degrees, >= 0. NaN gives NaN.
 * @param exponent  p, no unit, > 0.
 * @returns 0 to 1.
 * @throws InputError OUT_OF_RANGE for a negative sigma or an exponent that is not above 0.
 * @source From the characteristic function of the normal distribution, E cos(k g) = cos(k mu) exp(-k^2 s^2 / 2).
 * @example expectedCosinePower(5, 4, 3) // 0.98157
 */
export function expectedCosinePower(meanDeg: number, sigmaDeg: number, exponent: number): number {
  if (sigmaDeg < 0) throw new InputError('OUT_OF_RANGE', `sigmaDeg: expected >= 0, got ${sigmaDeg}`)
  const unspread = cosineLaw(meanDeg, exponent)
  if (Number.isNaN(unspread) || Number.isNaN(sigmaDeg)) return NaN
  if (sigmaDeg * RAD_PER_DEG < NARROWEST_SIGMA_RAD) return unspread
  const mean = distanceFromNorth(meanDeg)
  const sigma = Math.min(sigmaDeg * RAD_PER_DEG, WIDEST_SIGMA_RAD)
  if (mean + NORMAL_REACH * sigma < HALF_PI) {
    const cosine = (k: number) => Math.cos(k * mean) * Math.exp((-k * k * sigma * sigma) / 2)
    if (exponent === 1) return cosine(1)
    if (exponent === 2) return (1 + cosine(2)) / 2
    if (exponent === 3) return (3 * cosine(1) + cosine(3)) / 4
  }
  // Over z = (angle - mean) / sigma, one stretch for each forward half-turn in reach.
  const firstTurn = Math.round((mean - NORMAL_REACH * sigma) / (2 * Math.PI))
  const lastTurn = Math.round((mean + NORMAL_REACH * sigma) / (2 * Math.PI))
  let sum = 0
  for (let turn = firstTurn; turn <= lastTurn; turn++) {
    const offset = mean - turn * 2 * Math.PI
    sum += integrate(
      (z) => Math.pow(Math.max(Math.cos(offset + sigma * z), 0), exponent) * Math.exp((-z * z) / 2),
      Math.max((-HALF_PI - offset) / sigma, -NORMAL_REACH),
      Math.min((HALF_PI - offset) / sigma, NORMAL_REACH),
    )
  }
  return Math.min(sum / Math.sqrt(2 * Math.PI), 1)
}

/**
 * The same for a von Mises spread, by numerical integration, right to 1e-11.
 *
 * @param meanDeg  standing misalignment, degrees, either sign. NaN gives NaN.
 * @param kappa  concentration, no unit, >= 0; 0 is uniform, Infinity no spread. NaN gives NaN.
 * @param exponent  p, no unit, > 0.
 * @returns 0 to 1.
 * @throws InputError OUT_OF_RANGE for a negative kappa or an exponent that is not above 0.
 */
export function expectedCosinePowerVonMises(meanDeg: number, kappa: number, exponent: number): number {
  if (kappa < 0) throw new InputError('OUT_OF_RANGE', `kappa: expected >= 0, got ${kappa}`)
  const unspread = cosineLaw(meanDeg, exponent)
  if (Number.isNaN(unspread) || Number.isNaN(kappa)) return NaN
  if (kappa > 1 / NARROWEST_SIGMA_RAD ** 2) return unspread
  const mean = distanceFromNorth(meanDeg)
  // kappa (cos t - 1) = -2 kappa sin^2(t/2), which keeps its digits and cannot overflow.
  const halfSine = Math.sqrt(VON_MISES_REACH / (2 * kappa))
  const reach = halfSine < 1 ? 2 * Math.asin(halfSine) : Math.PI
  const density = (t: number) => Math.exp(-2 * kappa * Math.sin(t / 2) ** 2)
  let sum = 0
  for (const offset of [mean, mean - 2 * Math.PI]) {
    sum += integrate(
      (t) => Math.pow(Math.max(Math.cos(offset + t), 0), exponent) * density(t),
      Math.max(-reach, -HALF_PI - offset),
      Math.min(reach, HALF_PI - offset),
    )
  }
  return Math.min(sum / (2 * integrate(density, 0, reach)), 1)
}

/**
 * Share of the power that the standing part costs on top of a normal dynamic spread that stays: 1 - E(mu, s) / E(0, s).
 *
 * @returns fraction, 0 to 1, not a percentage; arguments, NaN and errors as in expectedCosinePower.
 * @example staticShareGivenDynamic(5, 4, 3) // 0.0112624
 */
export function staticShareGivenDynamic(meanDeg: number, sigmaDeg: number, exponent: number): number {
  return Math.max(
    1 - expectedCosinePower(meanDeg, sigmaDeg, exponent) / expectedCosinePower(0, sigmaDeg, exponent),
    0,
  )
}

/** Radians, 0 to pi: the answer is even and has a period of one turn. */
function distanceFromNorth(angleDeg: number): number {
  const within = Math.abs(angleDeg) % 360
  return Math.min(within, 360 - within) * RAD_PER_DEG
}
