import { dayWeights, type DayWeights } from '../../kernel/stats/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'

/** Lengths of the blocks of days that are resampled: weather holds for days, so neighbours are not independent. */
const BLOCK_DAYS = [1, 2, 4] as const

/**
 * The day weights of a replay, drawn once over the calendar days of its window and shared by all turbines, so that the
 * answer depends neither on threads nor on how the work is split.
 *
 * @param days  calendar days of the window, site zone.
 */
export function dayBlocks(days: number, settings: Pick<ScoringSettings, 'resamples' | 'seed'>): DayWeights[] {
  return BLOCK_DAYS.map((blockDays) =>
    dayWeights({ days, blockDays, resamples: settings.resamples, seed: settings.seed }),
  )
}
