import { InputError } from '../../errors.ts'
import { createRandom } from './random.ts'

/** How often each calendar day is drawn in each resample of a bootstrap. */
export interface DayWeights {
  readonly blockDays: number
  readonly days: number
  readonly resamples: number
  /** Times that day `d` is drawn in resample `r`, at [r * days + d]; each resample sums to `days`. */
  readonly counts: Uint16Array
}

/**
 * Circular moving-block bootstrap of calendar days: blocks of consecutive days, drawn with replacement, wrapped at the
 * end of the window, the last block cut so that every resample holds as many days as the window.
 * The weights depend on nothing but the arguments, so that all turbines of a farm share them and threads do not matter.
 *
 * @param options.days       calendar days in the window, with or without rows; >= 1.
 * @param options.blockDays  length of a block; cut to `days`.
 * @throws InputError OUT_OF_RANGE
 * @source Politis & Romano (1992), A circular block-resampling procedure for stationary data.
 */
export function dayWeights(options: {
  days: number
  blockDays: number
  resamples: number
  seed: number
}): DayWeights {
  const { days, resamples, seed } = options
  if (!(days >= 1 && days <= 65535))
    throw new InputError('OUT_OF_RANGE', `days: expected 1 to 65535, got ${days}`)
  if (!(options.blockDays >= 1))
    throw new InputError('OUT_OF_RANGE', `blockDays: expected >= 1, got ${options.blockDays}`)
  const blockDays = Math.min(options.blockDays, days)
  const random = createRandom(seed, blockDays)
  const counts = new Uint16Array(days * resamples)
  for (let r = 0; r < resamples; r++) {
    const base = r * days
    for (let filled = 0; filled < days; filled += blockDays) {
      const start = random.below(days)
      const length = Math.min(blockDays, days - filled)
      for (let k = 0; k < length; k++) counts[base + ((start + k) % days)]!++
    }
  }
  return { blockDays, days, resamples, counts }
}
