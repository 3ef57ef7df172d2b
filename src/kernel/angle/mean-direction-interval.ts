import { InputError } from '../../errors.ts'
import { circularMean } from './circular-mean.ts'
import { circularDispersion } from './circular-shape.ts'
import { DEG_PER_RAD } from './radians.ts'

/** Standard normal quantile of a two-sided 95 % interval. */
const NORMAL_95 = 1.959963984540054

/** From this resultant length on Zar uses the second of the two forms. */
const HIGH_CONCENTRATION = 0.9

export interface MeanDirectionInterval {
  /** Degrees, [0, 360); NaN when nothing is known or the angles cancel. */
  readonly direction: number
  /** Degrees either way, 0 to 90, or 180 when the data leave the whole circle open; NaN without a direction. */
  readonly halfWidth: number
  readonly count: number
}

/**
 * Confidence interval of the mean direction for any distribution, from large samples (n from about 25): half-width
 * asin(z sqrt(dispersion / n)). The angles must be independent: for rows of a log, which are not, resample days instead.
 *
 * @param anglesDeg       degrees, any turn; not finite = missing
 * @param normalQuantile  z > 0, standard normal quantile of the two-sided interval; 95 % by default
 * @returns whole circle (180) where the argument of the arcsine passes 1. One angle alone: NaN half-width.
 * @throws InputError OUT_OF_RANGE for a z that is not > 0
 * @source Fisher (1993), ch. 4
 */
export function meanDirectionInterval(
  anglesDeg: ArrayLike<number>,
  normalQuantile = NORMAL_95,
): MeanDirectionInterval {
  checkQuantile(normalQuantile)
  const { direction, count } = circularMean(anglesDeg)
  if (Number.isNaN(direction) || count < 2) return { direction, halfWidth: NaN, count }
  const sine = normalQuantile * Math.sqrt(circularDispersion(anglesDeg) / count)
  return { direction, halfWidth: sine <= 1 ? Math.asin(sine) * DEG_PER_RAD : 180, count }
}

/**
 * Confidence interval of the mean direction for von Mises angles, from small samples (n from 8): Zar's arccosine form, in
 * one formula below a resultant length of 0.9 and another from there on. It errs to the wide side: for large n by 32 % just
 * below 0.9, by 6 % at 0.9, less the closer the angles lie. The angles must be independent.
 *
 * @param anglesDeg       degrees, any turn; not finite = missing
 * @param normalQuantile  z > 0; z^2 is the chi-square quantile with one degree of freedom; 95 % by default
 * @returns whole circle (180) where no interval exists. One angle alone: NaN half-width.
 * @throws InputError OUT_OF_RANGE for a z that is not > 0
 * @source Zar (2010), Biostatistical Analysis, 5th ed., sec. 26.7, after Upton (1986)
 */
export function meanDirectionIntervalVonMises(
  anglesDeg: ArrayLike<number>,
  normalQuantile = NORMAL_95,
): MeanDirectionInterval {
  checkQuantile(normalQuantile)
  const { direction, resultant, count } = circularMean(anglesDeg)
  if (Number.isNaN(direction) || count < 2) return { direction, halfWidth: NaN, count }
  const share = (normalQuantile * normalQuantile) / count // chi-square quantile over n
  const r2 = resultant * resultant
  // Both forms divided by n^2, so that large n loses nothing: the squared projection of the resultant on the interval's end.
  const square =
    resultant < HIGH_CONCENTRATION
      ? (2 * (2 * r2 - share)) / Math.max(4 - share, 0)
      : r2 - (1 - r2) * Math.expm1(share)
  const halfWidth = square >= 0 ? Math.acos(Math.min(1, Math.sqrt(square) / resultant)) * DEG_PER_RAD : 180
  return { direction, halfWidth, count }
}

function checkQuantile(normalQuantile: number): void {
  if (!(normalQuantile > 0)) {
    throw new InputError('OUT_OF_RANGE', `normalQuantile: expected > 0, got ${normalQuantile}`)
  }
}
