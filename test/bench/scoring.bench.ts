/**
 * Scoring a warm month of 10-minute rows of one turbine (4,464 rows), frame, 1000 resamples of each block length and all
 * questions included, in milliseconds and as a ratio to plain work in the same run: sorting a Float64Array of 1,000,000.
 */
import { dayBlocks, nacelleRecords, signChecks } from '../../src/analysis/index.ts'
import { scoreTurbine } from '../../src/replay/score-turbine.ts'
import { farmScenario } from '../../src/simulate/index.ts'
import { cachedFarm, frameOf, STUDY_SETTINGS } from '../study/simulated-farms.ts'

const WARM_UP = 15
const PAIRS = 15

export function benchScoring(print: (text: string) => void): void {
  const settings = { ...STUDY_SETTINGS, resamples: 1000, assumedResponsePctPerDeg: 0 }
  const whole = cachedFarm(farmScenario({ seed: 77, turbines: 2, days: 31 }))
  const farm = { ...whole, turbines: whole.turbines.slice(0, 1) }
  const score = (): number => {
    const frame = frameOf(farm, settings)
    const days = frame.calendar.days
    const sheet = scoreTurbine({
      frame: frame.turbines[0]!,
      settings,
      dayWeights: dayBlocks(days, settings),
      days,
      response: null,
      farmEstimates: [],
      freeStream: null,
      sign: signChecks(frame)[0]!,
      farmFindings: [],
      farmTests: [],
      nacelle: nacelleRecords(frame, []).turbines[0]!,
      events: [],
      highRate: null,
      longTerm: undefined,
      prices: null,
    })
    return sheet.rows.accepted
  }
  const numbers = Float64Array.from({ length: 1_000_000 }, (_, i) => (i * 7919) % 1_000_003)
  const sort = (): number => numbers.slice().sort()[0]!
  for (let k = 0; k < WARM_UP; k++) score()
  const scoring: number[] = []
  const ratios: number[] = []
  for (let k = 0; k < PAIRS; k++) {
    const own = elapsedMs(score)
    const reference = elapsedMs(sort)
    scoring.push(own)
    ratios.push(own / reference)
  }
  print(
    `scoring a month of one turbine (${farm.turbines[0]!.timeMs.length} rows): median ${median(scoring).toFixed(1)} ms (at most 40), ` +
      `${median(ratios).toFixed(2)} x sorting a million numbers`,
  )
}

function elapsedMs(work: () => number): number {
  const start = performance.now()
  work()
  return performance.now() - start
}

function median(values: readonly number[]): number {
  return [...values].sort((a, b) => a - b)[values.length >> 1]!
}
