import { wrap180 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'

/** No yaw drive of a large turbine turns faster, degrees per second; usual are 0.2 to 0.6. Common practice, no source. */
export const FASTEST_YAW_DEG_S = 1
/** A coarse reading may step by so much at once, degrees. */
const COARSE_DEG = 10
/** A reading this far from those before and after, which agree, was no place of the nacelle; degrees. */
const AWAY_DEG = 45
const BACK_DEG = 10
/** While the turbine runs with a vane inside this: it faces the wind all along, degrees. */
const FACING_DEG = 20
/** Fewer readings that went away and came back may be chance. */
const FEWEST_AWAY = 3

/** Readings that no yaw drive can have made. */
export interface PositionJumps {
  /** From one row to the next faster than any drive turns. */
  readonly tooFast: number
  /** Single rows far from the rows before and after, while the turbine faced the wind. */
  readonly away: number
  readonly largestDeg: number
  readonly firstMs: number
  readonly lastMs: number
}

/**
 * Jumps of the position that are no movement. From rows of ten minutes only little can be seen: a turn of 360 degrees is
 * possible from one to the next.
 *
 * @param consensusDeg  direction of the farm at each row; NaN = unknown.
 * @returns null when there are none worth naming.
 */
export function positionJumps(turbine: TurbineFrame, consensusDeg: Float64Array): PositionJumps | null {
  const { time, nacellePosition, vane, running, intervalS } = turbine
  let tooFast = 0
  let away = 0
  let largestDeg = 0
  let firstMs = NaN
  let lastMs = NaN
  const note = (i: number, size: number): void => {
    if (Number.isNaN(firstMs)) firstMs = time[i]!
    lastMs = time[i]! + intervalS * 1000
    largestDeg = Math.max(largestDeg, size)
  }
  const off = (i: number): number => wrap180(nacellePosition[i]! + vane[i]! - consensusDeg[i]!)
  const faces = (i: number): boolean => running[i] === 1 && Math.abs(vane[i]!) < FACING_DEG
  const acrossNorth = turbine.averagedAcrossNorth.nacelle_position > 0
  for (let i = 1; i < time.length; i++) {
    const step = Math.abs(nacellePosition[i]! - nacellePosition[i - 1]!)
    const elapsedS = (time[i]! - time[i - 1]!) / 1000
    const short = Math.abs(step - 360) < step ? Math.abs(step - 360) : step // a wrapped scale may jump by one turn
    if (Math.min(step, short) > FASTEST_YAW_DEG_S * elapsedS + COARSE_DEG) {
      tooFast++
      note(i, step)
      continue
    }
    if (acrossNorth || i + 1 >= time.length || elapsedS > 1.5 * intervalS) continue
    if (!(faces(i - 1) && faces(i) && faces(i + 1) && time[i + 1]! - time[i]! < 1500 * intervalS)) continue
    const size = Math.abs(wrap180(off(i) - off(i - 1)))
    if (size > AWAY_DEG && Math.abs(wrap180(off(i + 1) - off(i - 1))) < BACK_DEG) {
      away++
      note(i, size)
    }
  }
  if (tooFast === 0 && away < FEWEST_AWAY) return null
  return { tooFast, away, largestDeg, firstMs, lastMs }
}
