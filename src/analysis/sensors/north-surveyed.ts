import { wrap180 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'
import type { TrueNorth } from './nacelle-north.ts'

/** How well a surveyed north holds, half-width at 95 %, degrees. Common practice, no source. */
const SURVEY_DEG = 1

/**
 * What surveyed turbines say of the consensus: their n is 0, so n - d is minus the offset of their vane. The surest one counts.
 *
 * @returns null without a surveyed turbine whose offset and place in the consensus are known.
 */
export function surveyedNorth(
  turbines: readonly TurbineFrame[],
  sheets: readonly TurbineSheet[],
): TrueNorth | null {
  let best: TrueNorth | null = null
  turbines.forEach(({ setup, turbine }, i) => {
    const { nacelle, staticOffset } = sheets[i]!
    const d = staticOffset.estimateDeg
    const [low, high] = staticOffset.interval95Deg
    const level = nacelle.northMinusVaneOffsetDeg
    if (setup.nacelle?.northOffsetSource !== 'surveyed' || nacelle.state !== 'compared') return
    if (d === null || level === null || typeof low !== 'number' || typeof high !== 'number') return
    const halfWidthDeg = Math.hypot((high - low) / 2, SURVEY_DEG)
    if (!(halfWidthDeg < (best?.halfWidthDeg ?? Infinity))) return
    best = {
      source: 'surveyed',
      shiftDeg: wrap180(-d - level),
      halfWidthDeg,
      note: `the surveyed north of ${turbine} ties the consensus to true north; its interval holds that of the offset of its vane`,
    }
  })
  return best
}
