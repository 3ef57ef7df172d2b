import { medianOf, resampledSlopes, type DayWeights } from '../../kernel/stats/index.ts'
import { NORMAL_95, resampledHalfWidth } from '../offset/resampled-spread.ts'
import type { FarmResponse } from './anemometer-response.ts'
import type { FarmComparison } from './farm-comparison.ts'
import type { GridChannel } from './farm-grid.ts'
import { neighbourSlopes, type NeighbourSlopes } from './neighbour-slopes.ts'

/** Wind speeds between which a change of the response is told, m/s: the ends of what offsets mostly rest on. */
export const SHAPE_SPEEDS_MS = [6, 10] as const
/**
 * A departure counts when so many SDs from 0. More than 2.58, as slow vane noise, which dilutes a response most where direction
 * varies least, makes one that is alike at all wind speeds seem larger at high ones by half an SD (measured on simulated farms).
 */
const BEYOND_CHANCE = 3

/** A departure from a response that is one number: its size, SD, and whether it lies beyond chance. */
export interface Departure {
  readonly size: number
  readonly sd: number
  readonly beyondChance: boolean
}

/** Whether the response of a model's anemometers is one number; mean of its turbines. */
export interface ResponseShape {
  readonly model: string
  /** By how much the response at 10 m/s is larger than the one at 6 m/s, relative change of the reading per degree. */
  readonly withSpeed: Departure
  /** Part of the reading that is the same on both sides: relative change per square degree of vane. */
  readonly square: Departure
}

/**
 * Offsets are corrected by one number for each anemometer: its reading changes in proportion to the vane, alike at all wind
 * speeds. Both are tested on what that number leaves: against the vane times ln of the farm's wind speed, and against the
 * square of the vane. A square bends the curve of power against vane and leaves its slope about 0, and so the offset, almost
 * alone; a response that changes with wind speed leaves an offset that does.
 *
 * @returns per model; without a model where no turbine can be compared.
 */
export function responseShape(
  comparison: FarmComparison,
  response: FarmResponse,
  dayWeights: readonly DayWeights[],
): ResponseShape[] {
  const { grid, vane, farmSpeed } = comparison
  const usual = Math.log(medianOf(farmSpeed))
  const left = comparison.logSpeed.map((values, i) => {
    const perDeg = response.turbines[i]?.perDeg ?? NaN
    return values.map((value, t) => value - perDeg * vane[i]![t]!)
  })
  const against = (x: GridChannel): NeighbourSlopes =>
    neighbourSlopes({
      grid,
      days: comparison.days,
      directionDeg: comparison.direction.consensusDeg,
      unrest: comparison.turbulence,
      own: left,
      others: left,
      x,
      otherX: x,
      // What the estimate is off by is proportional to the vane.
      nuisance: [vane],
    })
  const withSpeed = against(
    vane.map((values) => values.map((value, t) => value * (Math.log(farmSpeed[t]!) - usual))),
  )
  const square = against(vane.map((values) => values.map((value) => value * value)))
  const perLog = Math.log(SHAPE_SPEEDS_MS[1] / SHAPE_SPEEDS_MS[0])
  return response.models.map(({ model }) => {
    const members = grid.turbines.flatMap((turbine, i) => (turbine.model === model ? [i] : []))
    return {
      model,
      withSpeed: meanOf(withSpeed, members, dayWeights, perLog),
      square: meanOf(square, members, dayWeights, 1),
    }
  })
}

/** Mean coefficient of some turbines times a factor, with the widest SD over the block lengths. */
function meanOf(
  slopes: NeighbourSlopes,
  members: readonly number[],
  dayWeights: readonly DayWeights[],
  factor: number,
): Departure {
  const compared = members.filter((i) => slopes.slopes[i] !== null)
  if (compared.length === 0) return { size: NaN, sd: NaN, beyondChance: false }
  const mean = (coefficient: ArrayLike<number>): number =>
    (factor * compared.reduce((sum, i) => sum + coefficient[i]!, 0)) / compared.length
  const size = mean(slopes.coefficient)
  const days = Math.max(...compared.map((i) => slopes.slopes[i]!.days))
  const halves = dayWeights.map((weights) => {
    const direct = slopes.slopes.map((slope) => (slope ? resampledSlopes(slope.sums, weights) : null))
    const one = new Float64Array(direct.length)
    const means = new Float64Array(weights.resamples)
    for (let r = 0; r < weights.resamples; r++) {
      for (let i = 0; i < one.length; i++) {
        const slope = slopes.slopes[i]
        one[i] = slope ? slope.direct + (direct[i]![r]! - slope.direct) * slope.stretch : NaN
      }
      means[r] = mean(slopes.solve(one))
    }
    return resampledHalfWidth(means, weights, days)
  })
  const sd = Math.max(...halves.filter((half) => !Number.isNaN(half)), -Infinity) / NORMAL_95
  if (!(sd > 0)) return { size, sd: NaN, beyondChance: false }
  return { size, sd, beyondChance: Math.abs(size) > BEYOND_CHANCE * sd }
}
