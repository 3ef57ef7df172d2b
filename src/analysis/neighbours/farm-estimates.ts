import { DEG_PER_RAD, RAD_PER_DEG, wrap180 } from '../../kernel/angle/index.ts'
import { resampledSlopes, type DayWeights } from '../../kernel/stats/index.ts'
import { powerAt, steepnessAt } from '../../kernel/wind/index.ts'
import { correctSpeed, REASON_CODE, type TurbineFrame } from '../../frame/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import type { FarmResponse } from './anemometer-response.ts'
import type { FarmComparison } from './farm-comparison.ts'
import { onGrid, type GridChannel } from './farm-grid.ts'
import { neighbourSlopes, type NeighbourSlopes } from './neighbour-slopes.ts'
import { NORMAL_95, resampledHalfWidth } from '../offset/resampled-spread.ts'

/** Share of link from which the form with local directions is taken. */
const LINKED = 0.5
const ROUNDS = 3
const MAX_OFFSET_RAD = 45 * RAD_PER_DEG
/** Rows of these reasons say as much about power as used ones: the farm's wind picks them, not their own. */
const PICKED_BY_FARM = new Set([0, REASON_CODE['outside-wind-range']])

/** An estimate of d of one turbine that leans on its neighbours. */
export interface FarmEstimate {
  readonly method: 'power against vane, neighbours’ wind' | 'power ratios of the farm'
  readonly offsetDeg: number
  readonly halfWidthDeg: number
  readonly leansOn: string
  readonly rows: number
  readonly days: number
}

/**
 * Offsets from power against what neighbours show, in two ways: against their wind (corrected for their response), and
 * against their power, solved for all turbines at once. Neither needs the turbine's own anemometer but to pick rows; both lean
 * on the same comparison as the response does, so that their agreement with the first estimate is no proof.
 *
 * @returns per turbine, in the order of the farm; empty where it cannot be compared.
 */
export function farmEstimates(
  comparison: FarmComparison,
  response: FarmResponse,
  dayWeights: readonly DayWeights[],
  settings: ScoringSettings,
): FarmEstimate[][] {
  const { grid, direction, farmSpeed } = comparison
  const responseOf = (i: number): number => response.turbines[i]?.perDeg ?? 0
  const frames = grid.turbines.map((turbine, i) => correctSpeed(turbine, responseOf(i), settings.vaneMaxDeg))
  const corrected = { ...grid, turbines: frames }
  const windByPower = restrictedTo(
    onGrid(corrected, impliedLogSpeed),
    frames,
    farmSpeed,
    settings,
    comparison.steady,
  )
  const vaneRad = onGrid(grid, (turbine, row) => turbine.vane[row]! * RAD_PER_DEG)
  const nuisance = response.linkShare >= LINKED ? comparison.localDirection : []
  const neighbourWind = comparison.logSpeed.map((values, i) =>
    values.map((value, t) => value - responseOf(i) * comparison.vane[i]![t]!),
  )
  const common = {
    grid,
    days: comparison.days,
    directionDeg: direction.consensusDeg,
    nuisance,
    unrest: comparison.turbulence,
  }
  const third = settings.exponent / 3

  const solve = (byRatio: boolean): { offset: Float64Array; slopes: NeighbourSlopes | null } => {
    const offset = new Float64Array(grid.turbines.length)
    let slopes: NeighbourSlopes | null = null
    for (let round = 0; round < ROUNDS; round++) {
      const yaw = (angle: number): number => Math.max(-MAX_OFFSET_RAD, Math.min(MAX_OFFSET_RAD, angle))
      const own = windByPower.map((values, i) =>
        values.map((value, t) => value - third * Math.log(Math.cos(yaw(vaneRad[i]![t]! + offset[i]!)))),
      )
      const x = vaneRad.map((values, i) => values.map((vane) => -third * Math.tan(yaw(vane + offset[i]!))))
      slopes = neighbourSlopes({
        ...common,
        own,
        others: byRatio ? own : neighbourWind,
        x,
        otherX: byRatio ? x : null,
      })
      for (let i = 0; i < offset.length; i++) {
        const step = slopes.coefficient[i]!
        if (!Number.isNaN(step)) offset[i] = yaw(offset[i]! + step)
      }
    }
    return { offset, slopes }
  }
  const byWind = solve(false)
  const byRatio = solve(true)
  return grid.turbines.map((_, i) =>
    [
      estimateOf(byWind, i, dayWeights, {
        method: 'power against vane, neighbours’ wind',
        leansOn: 'wind of the neighbours, corrected for their response; local wind and direction',
      }),
      estimateOf(byRatio, i, dayWeights, {
        method: 'power ratios of the farm',
        leansOn: 'power of the neighbours with their own offsets; no anemometer; local wind and direction',
      }),
    ].filter((estimate) => estimate !== null),
  )
}

/** ln of the wind speed that the power stands for, by the measured curve about the wind speed as read. */
function impliedLogSpeed(frame: TurbineFrame, row: number): number {
  const speed = frame.normalisedSpeed[row]!
  if (!PICKED_BY_FARM.has(frame.reason[row]!)) return NaN
  const steepness = steepnessAt(frame.curve, speed)
  return Math.log(speed) + Math.log(frame.power[row]! / powerAt(frame.curve, speed)) / steepness
}

/** Only intervals in which the farm's wind speed lies well inside the range that is used. */
function restrictedTo(
  values: GridChannel,
  frames: readonly TurbineFrame[],
  farmSpeed: Float64Array,
  settings: ScoringSettings,
  steady: Uint8Array,
): GridChannel {
  return values.map((series, i) =>
    series.map((value, t) => {
      const inside = farmSpeed[t]! >= settings.windMinMs + 0.3 && farmSpeed[t]! <= frames[i]!.windMaxMs - 0.3
      return inside && steady[t] === 1 && Number.isFinite(value) ? value : NaN
    }),
  )
}

function estimateOf(
  solved: { offset: Float64Array; slopes: NeighbourSlopes | null },
  i: number,
  dayWeights: readonly DayWeights[],
  text: Pick<FarmEstimate, 'method' | 'leansOn'>,
): FarmEstimate | null {
  const slope = solved.slopes?.slopes[i]
  if (!slope) return null
  const halves = dayWeights
    .map((weights) => resampledHalfWidth(resampledSlopes(slope.sums, weights), weights, slope.days))
    .filter((half) => !Number.isNaN(half))
  if (halves.length === 0) return null
  return {
    ...text,
    offsetDeg: wrap180(solved.offset[i]! * DEG_PER_RAD),
    halfWidthDeg: Math.max(...halves) * slope.stretch * DEG_PER_RAD,
    rows: slope.rows,
    days: slope.days,
  }
}

/** Whether two estimates differ by more than their errors would let them in one of a few hundred turbines. */
export function disagree(
  first: { offsetDeg: number; halfWidthDeg: number },
  second: { offsetDeg: number; halfWidthDeg: number },
): boolean {
  const sd = Math.hypot(first.halfWidthDeg, second.halfWidthDeg) / NORMAL_95
  return Math.abs(wrap180(first.offsetDeg - second.offsetDeg)) > 3.3 * sd
}
