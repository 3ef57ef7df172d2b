import jstat from 'jstat'

/**
 * Chance that a chi-square variable exceeds a value.
 *
 * @param value  >= 0.
 * @param degreesOfFreedom  > 0.
 * @returns 0 to 1; NaN outside these ranges.
 * @source jstat's regularised incomplete gamma function; 1 minus it, so that below about 1e-15 it is 0.
 */
export function chiSquareUpperTail(value: number, degreesOfFreedom: number): number {
  if (!(value >= 0 && degreesOfFreedom > 0)) return NaN
  return Math.max(0, Math.min(1, 1 - jstat.jStat.lowRegGamma(degreesOfFreedom / 2, value / 2)))
}
