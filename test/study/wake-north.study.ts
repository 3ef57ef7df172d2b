/**
 * How well do wakes tie the farm's consensus direction to true north? Monte Carlo over simulated farms unlike each other, of 9
 * turbines and 90 days, each with a north of its own. Not part of `npm test`.
 *
 *   npm run study -- wakes [farms]
 */
import { dayBlocks, nacelleRecords, northByWakes } from '../../src/analysis/index.ts'
import { wrap180 } from '../../src/kernel/angle/index.ts'
import { randomScenario } from '../../src/simulate/index.ts'
import { cachedFarm, frameOf, STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 9510
const DAYS = 90
const TURBINES = 9
const WITHIN_DEG = 2

export function wakeNorthStudy(farms: number, print: (text: string) => void): void {
  const errors: number[] = []
  let covered = 0
  let told = 0
  let within = 0
  const halves: number[] = []
  for (let k = 0; k < farms; k++) {
    const farm = cachedFarm(randomScenario(FIRST_SEED + k, { days: DAYS, turbines: TURBINES }))
    const frame = frameOf(farm, STUDY_SETTINGS)
    const { turbines, consensusDeg } = nacelleRecords(frame, [])
    const wakes = northByWakes(frame, consensusDeg, dayBlocks(frame.calendar.days, STUDY_SETTINGS))
    if (!wakes) continue
    told++
    halves.push(wakes.halfWidthDeg)
    const own = farm.turbines.map(({ truth }, i) => {
      const level = turbines[i]!.levels.at(-1)!
      const error = wrap180(level.deg + wakes.shiftDeg - (truth.northOffsetDeg - truth.offsetDeg))
      if (Math.abs(error) <= Math.hypot(level.halfWidthDeg, wakes.halfWidthDeg)) covered++
      return Math.abs(error)
    })
    errors.push(...own)
    if (Math.max(...own) <= WITHIN_DEG) within++
  }
  errors.sort((a, b) => a - b)
  const median = errors[errors.length >> 1] ?? NaN
  const half = halves.reduce((sum, value) => sum + value, 0) / halves.length
  print(
    '| 9 turbines, 90 days | farms | told | all turbines within 2 degrees | error, degrees: median, largest | half-width | inside it |',
  )
  print('|---|---|---|---|---|---|---|')
  print(
    `| n - d by wakes | ${farms} | ${told} | ${within} | ${median.toFixed(2)}, ${(errors.at(-1) ?? NaN).toFixed(2)} | ${half.toFixed(2)} | ${covered} of ${errors.length} |`,
  )
}
