import { gamma } from 'simple-statistics'
import { InputError } from '../../errors.ts'

/**
 * Share of the time in which the wind is at or below a speed, for a Rayleigh distribution.
 *
 * @param speedMs  m/s; below 0 counts as 0. NaN gives NaN.
 * @param meanSpeedMs  mean of the distribution, m/s, > 0.
 * @returns 0 to 1.
 * @throws InputError OUT_OF_RANGE for a mean that is not above 0.
 * @source F(V) = 1 - exp(-(pi/4) (V/Vave)^2), as IEC 61400-12-1 uses it.
 */
export function rayleighCumulative(speedMs: number, meanSpeedMs: number): number {
  if (!(meanSpeedMs > 0)) throw outOfRange('meanSpeedMs', meanSpeedMs)
  return -Math.expm1(-(Math.PI / 4) * (Math.max(speedMs, 0) / meanSpeedMs) ** 2)
}

/**
 * The same for a Weibull distribution.
 *
 * @param speedMs  m/s; below 0 counts as 0. NaN gives NaN.
 * @param weibull  scale, m/s, > 0 (not the mean: that is scale x Gamma(1 + 1/shape)); shape, no unit, > 0.
 * @returns 0 to 1: 1 - exp(-(V/scale)^shape).
 * @throws InputError OUT_OF_RANGE for a scale or shape that is not above 0.
 */
export function weibullCumulative(speedMs: number, weibull: { scaleMs: number; shape: number }): number {
  if (!(weibull.scaleMs > 0)) throw outOfRange('scaleMs', weibull.scaleMs)
  if (!(weibull.shape > 0)) throw outOfRange('shape', weibull.shape)
  return -Math.expm1(-Math.pow(Math.max(speedMs, 0) / weibull.scaleMs, weibull.shape))
}

/**
 * Scale of the Weibull distribution that has a given mean: mean / Gamma(1 + 1/shape).
 *
 * @param meanSpeedMs  m/s, > 0.
 * @param shape  no unit, > 0; 2 is a Rayleigh distribution.
 * @returns m/s; right to 1e-8 of itself for shapes above 0.5.
 * @throws InputError OUT_OF_RANGE for a mean or shape that is not above 0.
 */
export function weibullScale(meanSpeedMs: number, shape: number): number {
  if (!(meanSpeedMs > 0)) throw outOfRange('meanSpeedMs', meanSpeedMs)
  if (!(shape > 0)) throw outOfRange('shape', shape)
  return meanSpeedMs / gamma(1 + 1 / shape)
}

/**
 * Shape of the Weibull distribution with a given mean and standard deviation, near enough for a table: (SD / mean)^-1.086.
 *
 * @returns no unit; within 1.2 % for shapes of 1 to 10. NaN unless both are above 0.
 * @source Justus, Hargraves, Mikhail & Graber (1978), Methods for estimating wind speed frequency distributions.
 */
export function weibullShapeFrom(meanSpeedMs: number, sdMs: number): number {
  return meanSpeedMs > 0 && sdMs > 0 ? Math.pow(sdMs / meanSpeedMs, -1.086) : NaN
}

function outOfRange(name: string, value: number): InputError {
  return new InputError('OUT_OF_RANGE', `${name}: expected > 0, got ${value}`)
}
