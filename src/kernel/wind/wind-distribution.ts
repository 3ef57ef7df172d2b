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

function outOfRange(name: string, value: number): InputError {
  return new InputError('OUT_OF_RANGE', `${name}: expected > 0, got ${value}`)
}
