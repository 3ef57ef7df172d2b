import { robustSd } from '../../kernel/stats/index.ts'

/** Differences of blocks below which a block length says nothing of the noise. */
const MIN_DIFFERENCES = 8

/**
 * Variance of the noise of a series of slopes (or, with xx = rows of each point and xy = their sum, of means) whose true
 * value changes now and then: from differences of blocks that follow each other, each block length on its own. The
 * largest counts, so that noise that hangs together over days does not pass for a change.
 *
 * @param xx, xy  weight and weight x value of each point; length n. xx = 0: no data, passed over.
 * @param blockPoints  lengths of the blocks, in points.
 * @returns variance of a point of weight 1; NaN where no block length has differences enough.
 */
export function blockNoise(
  xx: ArrayLike<number>,
  xy: ArrayLike<number>,
  blockPoints: readonly number[],
): number {
  const known: number[] = []
  for (let i = 0; i < xx.length; i++) if (xx[i]! > 0) known.push(i)
  let largest = NaN
  for (const length of blockPoints) {
    const differences: number[] = []
    for (let start = 0; start + 2 * length <= known.length; start++) {
      const [leftWeight, leftValue] = blockMean(start)
      const [rightWeight, rightValue] = blockMean(start + length)
      differences.push((rightValue - leftValue) / Math.sqrt(1 / leftWeight + 1 / rightWeight))
    }
    if (differences.length < MIN_DIFFERENCES) continue
    const variance = robustSd(differences) ** 2
    if (!(largest >= variance)) largest = variance

    function blockMean(start: number): [weight: number, value: number] {
      let weight = 0
      let total = 0
      for (let k = start; k < start + length; k++) {
        weight += xx[known[k]!]!
        total += xy[known[k]!]!
      }
      return [weight, total / weight]
    }
  }
  return largest
}
