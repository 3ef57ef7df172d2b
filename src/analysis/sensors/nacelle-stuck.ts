import { wrap180 } from '../../kernel/angle/index.ts'
import { frozenRuns } from '../../kernel/motion/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'

/** A reading that does not change for so long is looked at, s. */
const VANE_STILL_S = 3600
const POSITION_STILL_S = 3 * 3600
/** Readings this near are the same: what parsing and scaling leave, degrees. */
const SAME_DEG = 1e-6
/** N + v ran away from the farm by so much while N stood: the nacelle had turned. Degrees. */
const RAN_AWAY_DEG = 20
/** Rows at either end from which that is taken. */
const END_ROWS = 6

/** A spell over which the position stood still although the nacelle turned. */
export interface StuckSpell {
  readonly fromMs: number
  readonly toMs: number
  /** How far N + v ran from where it stood against the farm when the spell began, degrees. */
  readonly ranAwayDeg: number
}

/** Rows of a turbine in which the vane keeps exactly one value for an hour and more: N + v then tells nothing of N. */
export function vaneStill(turbine: TurbineFrame): Uint8Array {
  const still = new Uint8Array(turbine.time.length)
  for (const [from, to] of runsOf(turbine.vane, turbine, VANE_STILL_S)) still.fill(1, from, to)
  return still
}

/**
 * Spells in which the position keeps exactly one value while N + v runs away from the farm: had the nacelle stood, its vane
 * would have shown the wind's turn.
 *
 * @param deviationDeg  N + v against the farm, row by row of the turbine; NaN = not known.
 */
export function stuckSpells(turbine: TurbineFrame, deviationDeg: Float64Array): StuckSpell[] {
  const { time, nacellePosition, intervalS } = turbine
  const spells: StuckSpell[] = []
  for (const [from, to] of runsOf(nacellePosition, turbine, POSITION_STILL_S)) {
    const known = [...deviationDeg.subarray(from, to)].filter((value) => !Number.isNaN(value))
    if (known.length < 2 * END_ROWS) continue
    const start = known[0]!
    const path = known.map((value) => wrap180(value - start)).sort((a, b) => a - b)
    // The extremes but for a few rows: a gust is no turn.
    const ranAwayDeg = path.at(-1 - END_ROWS / 2)! - path[END_ROWS / 2]!
    if (!(ranAwayDeg > RAN_AWAY_DEG)) continue
    spells.push({ fromMs: time[from]!, toMs: time[to - 1]! + intervalS * 1000, ranAwayDeg })
  }
  return spells
}

function runsOf(values: Float64Array, turbine: TurbineFrame, leastS: number): [from: number, to: number][] {
  const least = Math.max(6, Math.ceil(leastS / turbine.intervalS))
  if (values.length < least) return []
  const { start, length } = frozenRuns(values, least, SAME_DEG)
  return Array.from(start, (from, k) => [from, from + length[k]!])
}
