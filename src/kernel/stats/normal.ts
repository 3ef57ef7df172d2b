import jstat from 'jstat'

/**
 * Probability that a standard normal variate lies below z.
 *
 * @returns 0 to 1; NaN for NaN.
 * @source jstat's complementary error function; accurate to about 1e-7.
 */
export function normalProbability(z: number): number {
  return jstat.jStat.erfc(-z / Math.SQRT2) / 2
}
