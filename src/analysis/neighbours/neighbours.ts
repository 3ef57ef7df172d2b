import type { DayWeights } from '../../kernel/stats/index.ts'
import type { Frame } from '../../frame/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import { anemometerResponse, type FarmResponse } from './anemometer-response.ts'
import { farmComparison, type FarmComparison } from './farm-comparison.ts'
import { farmEstimates, type FarmEstimate } from './farm-estimates.ts'
import { responseShape, type ResponseShape } from './response-shape.ts'

/** What turbines tell of each other. */
export interface Neighbours {
  readonly response: FarmResponse
  /** Whether it is one number, per model. */
  readonly shapes: readonly ResponseShape[]
  /** Per turbine, in the order of the farm. */
  readonly estimates: readonly (readonly FarmEstimate[])[]
  /** Per turbine and row of its frame: 1 = free stream, 0 = in or beside a wake, or not known. */
  readonly freeStream: readonly Uint8Array[]
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
  return {
    response,
    shapes: responseShape(comparison, response, dayWeights),
    estimates: farmEstimates(comparison, response, dayWeights, settings),
    freeStream: byRow(comparison),
  }
}

/** From the clock of the farm to the rows of each turbine. */
function byRow({ grid, free }: FarmComparison): Uint8Array[] {
  return grid.turbines.map((turbine, i) => {
    const rows = new Uint8Array(turbine.time.length)
    grid.row[i]!.forEach((row, t) => {
      if (row >= 0) rows[row] = free[i]![t]!
    })
    return rows
  })
}
