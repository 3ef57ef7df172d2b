import type { DayWeights } from '../../kernel/stats/index.ts'
import type { Frame } from '../../frame/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import { anemometerResponse, type FarmResponse } from './anemometer-response.ts'
import { farmComparison } from './farm-comparison.ts'
import { farmEstimates, type FarmEstimate } from './farm-estimates.ts'

/** What turbines tell of each other. */
export interface Neighbours {
  readonly response: FarmResponse
  /** Per turbine, in the order of the farm. */
  readonly estimates: readonly (readonly FarmEstimate[])[]
}

/** The frame without its calendar, so that it can travel to a worker thread. */
export type FarmRows = Pick<Frame, 'intervalS' | 'fromMs' | 'toMs' | 'turbines'>

/**
 * Compares the turbines of a farm with each other: the responses of their anemometers, and offsets that lean on neighbours.
 *
 * @param days  calendar days of the window.
 * @returns null for a lone turbine, or where none can be compared.
 */
export function compareNeighbours(
  farm: FarmRows,
  days: number,
  dayWeights: readonly DayWeights[],
  settings: ScoringSettings,
): Neighbours | null {
  if (farm.turbines.length < 2) return null
  const comparison = farmComparison(farm, days, settings)
  const response = anemometerResponse(comparison, dayWeights, settings)
  if (response.turbines.every((turbine) => turbine === null)) return null
  return { response, estimates: farmEstimates(comparison, response, dayWeights, settings) }
}
