import { circularMean, wrap180 } from '../../kernel/angle/index.ts'
import { robustSd } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { FarmGrid } from '../neighbours/farm-grid.ts'
import { hoursOf, type Hour } from './nacelle-deviation.ts'

/** Another zero is at least so far from the last one: what weather does to one turbine for two hours is less. Degrees. */
const LEAST_JUMP_DEG = 15
/** ... and so many robust standard deviations of one hour against the next. */
const JUMP_SDS = 6
/** Hours from which the zero in force is taken. */
const LEVEL_HOURS = 24
/** With fewer jumps they are steps, each told for itself. */
const AGAIN_AND_AGAIN = 4
/** Share of jumps beside a stop or gap from which stops are to blame. */
const AT_STOPS = 0.6

/** Time with one zero of the position. */
export interface ZeroPiece {
  readonly fromMs: number
  readonly toMs: number
  /** Mean of the hours, degrees, on the scale of the series. */
  readonly deg: number
  /** At 95 %, from the scatter of hours taken as independent; NaN with one. */
  readonly halfWidthDeg: number
}

/** A position sensor that takes another zero again and again. */
export interface ZeroLost {
  readonly pieces: readonly ZeroPiece[]
  readonly jumps: number
  /** Jumps with a stop or a gap beside them. */
  readonly atStops: number
  readonly afterStops: boolean
  /** Median and largest jump, degrees. */
  readonly medianJumpDeg: number
  readonly largestJumpDeg: number
}

/**
 * Whether N + v against the farm jumps again and again to another level that then holds for hours.
 *
 * @param deviationDeg  on the farm's clock, from rows that run; NaN = missing.
 * @returns null with fewer than four jumps.
 */
export function zeroLost(
  turbine: TurbineFrame,
  grid: FarmGrid,
  rowOf: Int32Array,
  deviationDeg: Float64Array,
  clock: { fromMs: number; intervalS: number },
): ZeroLost | null {
  const hours = hoursOf(deviationDeg, clock.intervalS)
  const groups = levels(hours)
  if (groups.length - 1 < AGAIN_AND_AGAIN) return null
  const timeOf = (t: number): number => clock.fromMs + t * clock.intervalS * 1000
  const stood = (from: number, to: number): boolean => {
    for (let t = from; t < to; t++) {
      const row = rowOf[t]!
      if (row < 0 || turbine.running[row] !== 1) return true
    }
    return false
  }
  const pieces = groups.map((group, k): ZeroPiece => {
    const { direction, resultant } = circularMean(group.map(({ deg }) => deg))
    const sd = Math.sqrt(-2 * Math.log(Math.max(resultant, 1e-9))) / (Math.PI / 180)
    return {
      fromMs: timeOf(k === 0 ? 0 : group[0]!.from),
      toMs: timeOf(groups[k + 1]?.[0]!.from ?? grid.length),
      deg: wrap180(direction),
      halfWidthDeg: group.length > 1 ? (2 * sd) / Math.sqrt(group.length - 1) : NaN,
    }
  })
  const sizes = pieces.slice(1).map((piece, k) => Math.abs(wrap180(piece.deg - pieces[k]!.deg)))
  const sorted = [...sizes].sort((a, b) => a - b)
  const atStops = groups.slice(1).filter((group, k) => stood(groups[k]!.at(-1)!.from, group[0]!.to)).length
  return {
    pieces,
    jumps: sizes.length,
    atStops,
    afterStops: atStops >= AT_STOPS * sizes.length,
    medianJumpDeg: sorted[sorted.length >> 1]!,
    largestJumpDeg: sorted.at(-1)!,
  }
}

/** Hours by the level they belong to. One odd hour is none; two in a row that agree are. */
function levels(hours: readonly Hour[]): Hour[][] {
  const changes = hours.slice(1).map((hour, k) => wrap180(hour.deg - hours[k]!.deg))
  const least = Math.max(LEAST_JUMP_DEG, JUMP_SDS * robustSd(changes) * Math.SQRT1_2)
  const groups: Hour[][] = []
  let level: Hour[] = []
  let odd: Hour | null = null
  for (const hour of hours) {
    if (level.length === 0) {
      level = [hour]
      groups.push(level)
      continue
    }
    const now = circularMean(level.slice(-LEVEL_HOURS).map(({ deg }) => deg)).direction
    const off = Math.abs(wrap180(hour.deg - now))
    if (!(off > least)) {
      level.push(hour)
      odd = null
    } else if (odd && Math.abs(wrap180(hour.deg - odd.deg)) < least / 2) {
      level = [odd, hour]
      groups.push(level)
      odd = null
    } else {
      odd = hour
    }
  }
  return groups
}
