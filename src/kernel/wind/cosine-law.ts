import { InputError } from '../../errors.ts'
import { RAD_PER_DEG } from '../angle/index.ts'

/**
 * Share of the power of an aligned rotor that is left at a yaw error, below rated: max(cos g, 0)^p.
 *
 * @param yawErrorDeg  degrees, any turn, either sign. NaN gives NaN.
 * @param exponent  p, no unit, > 0; 3 is the cos-cubed rule. Given, not known: see the band of exponents in a sheet.
 * @returns 0 to 1; 0 from 90 degrees on.
 * @throws InputError OUT_OF_RANGE for an exponent that is not above 0.
 * @example cosineLaw(10, 3) // 0.95511
 */
export function cosineLaw(yawErrorDeg: number, exponent: number): number {
  if (!(exponent > 0)) throw new InputError('OUT_OF_RANGE', `exponent: expected > 0, got ${exponent}`)
  return Math.pow(Math.max(Math.cos(yawErrorDeg * RAD_PER_DEG), 0), exponent)
}

/**
 * Share of the power that a yaw error costs: 1 - max(cos g, 0)^p, without the rounding of that difference near 0.
 *
 * @returns 0 to 1, a fraction and not a percentage. Arguments and errors as in cosineLaw.
 */
export function lossShare(yawErrorDeg: number, exponent: number): number {
  if (!(cosineLaw(yawErrorDeg, exponent) > 0)) return 1 - cosineLaw(yawErrorDeg, exponent)
  // cos g = 1 - 2 sin^2(g/2): small errors keep their digits.
  const halfSine = Math.sin((yawErrorDeg * RAD_PER_DEG) / 2)
  return -Math.expm1(exponent * Math.log1p(-2 * halfSine * halfSine))
}
