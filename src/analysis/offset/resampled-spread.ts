import { studentQuantile, type DayWeights } from '../../kernel/stats/index.ts'

export const NORMAL_95 = 1.959963984540054

/**
 * Half-width at 95 % of an estimate that was resampled by blocks of days: the SD of the resamples times a t quantile for the
 * number of days. Callers take the widest over several block lengths, which guards against days that hang together. That a
 * bootstrap over B blocks spreads too little, by (B - 1) / B, is left to that choice: with both, simulated farms were
 * covered in 97 to 99 % of cases.
 *
 * @param values    one per resample; NaN (a resample without variation) is left out.
 * @param usedDays  days with rows.
 * @returns NaN when there are fewer than two blocks of this length.
 */
export function resampledHalfWidth(values: Float64Array, weights: DayWeights, usedDays: number): number {
  if (!(usedDays / weights.blockDays >= 2)) return NaN
  let n = 0
  let mean = 0
  let squares = 0
  for (const value of values) {
    if (Number.isNaN(value)) continue
    n++
    const delta = value - mean
    mean += delta / n
    squares += delta * (value - mean)
  }
  return n < 2 ? NaN : studentQuantile(0.975, usedDays - 1) * Math.sqrt(squares / (n - 1))
}

/** Of the shortest and of the longest blocks; an SD from so many is known to 5 %. */
const FEW_RESAMPLES = 200

/** Few resamples of the shortest and of the longest blocks: where a coarser half-width will do. */
export function fewResamples(dayWeights: readonly DayWeights[]): DayWeights[] {
  return dayWeights
    .filter((_, k) => k === 0 || k === dayWeights.length - 1)
    .map((weights) => {
      const resamples = Math.min(FEW_RESAMPLES, weights.resamples)
      return { ...weights, resamples, counts: weights.counts.subarray(0, resamples * weights.days) }
    })
}
