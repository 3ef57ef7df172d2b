import jstat from 'jstat'

/**
 * Quantile of Student's t distribution.
 *
 * @param probability  0 to 1, exclusive.
 * @param degreesOfFreedom  > 0.
 * @returns NaN outside these ranges.
 * @source jstat; accurate to about 1e-7 of the value.
 */
export function studentQuantile(probability: number, degreesOfFreedom: number): number {
  if (!(probability > 0 && probability < 1) || !(degreesOfFreedom > 0)) return NaN
  return jstat.jStat.studentt.inv(probability, degreesOfFreedom)
}
