/**
 * How good are offsets where the response of the anemometers is not known and neighbours have to tell it? Monte Carlo over
 * strata of simulated farms with known truth. Not part of `npm test`.
 *
 *   npm run study -- neighbours [farms for each stratum]
 */
import { compareNeighbours, dayBlocks, staticOffset, verdictOf } from '../../src/analysis/index.ts'
import { farmScenario, type FarmScenario } from '../../src/simulate/index.ts'
import { cachedFarm, frameOf, STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 20_000

const NINE = { turbines: 9, days: 30, anemometerResponsePerDeg: -0.003, anemometerResponseSpread: 0.0003 }

/** Name, what differs from farms of nine over 30 days with a response of -0.3 % and a spread of 0.03 % per degree. */
const STRATA: readonly [string, Partial<FarmScenario>][] = [
  ['response -0.3, spread 0.03', {}],
  ['spread 0', { anemometerResponseSpread: 0 }],
  ['spread 0.07', { anemometerResponseSpread: 0.0007 }],
  ['response 0', { anemometerResponsePerDeg: 0 }],
  ['response +0.1', { anemometerResponsePerDeg: 0.001 }],
  ['response +0.3', { anemometerResponsePerDeg: 0.003 }],
  ['link +0.2', { linkCorrelation: 0.2 }],
  ['link -0.2', { linkCorrelation: -0.2 }],
  ['vane noise 0', { vaneNoiseDeg: 0, vaneSlowNoiseDeg: 0 }],
  ['vane gain 1.3', { vaneGain: 1.3 }],
  ['true p 2, read at 3', { exponent: 2 }],
  [
    'vane logged before correction',
    { vaneLogged: 'beforeCorrection', correctionsDeg: Array.from({ length: 9 }, (_, i) => i - 4) },
  ],
  ['12 turbines, 90 days, spread 0.07', { turbines: 12, days: 90, anemometerResponseSpread: 0.0007 }],
  ['3 turbines', { turbines: 3 }],
  ['1 turbine', { turbines: 1 }],
]

export function neighboursStudy(farms: number, print: (text: string) => void): void {
  print(
    '| stratum | turbines | bias | RMSE | RMSE of a farm, median | apart from the farm’s common error | coverage | width median | ' +
      'interval score | false offset at |m| <= 2 | found at |m| >= 4.5 |',
  )
  print('|---|---|---|---|---|---|---|---|---|---|---|')
  for (const [name, overrides] of STRATA) print(stratum(name, farms, overrides))
}

function stratum(name: string, farms: number, overrides: Partial<FarmScenario>): string {
  const settings = STUDY_SETTINGS
  const errors: number[] = []
  const widths: number[] = []
  const scores: number[] = []
  const rmse: number[] = []
  const apart: number[] = []
  let covered = 0
  let small = 0
  let smallCalled = 0
  let large = 0
  let largeFound = 0
  for (let k = 0; k < farms; k++) {
    const seed = FIRST_SEED + k
    const farm = cachedFarm(
      farmScenario({
        ...NINE,
        ...overrides,
        seed,
        layout: {
          columns: 3 + (k % 2),
          spacingD: 4.5 + (k % 3) * 0.5,
          rowSpacingD: 6,
          bearingDeg: (k * 37) % 180,
        },
      }),
    )
    const frame = frameOf(farm, settings)
    const days = frame.calendar.days
    const dayWeights = dayBlocks(days, settings)
    const neighbours = compareNeighbours(frame, days, dayWeights, settings)
    const own: number[] = []
    frame.turbines.forEach((turbine, i) => {
      const { standing } = staticOffset(turbine, {
        settings,
        dayWeights,
        days,
        response: neighbours?.response.turbines[i] ?? null,
        farmEstimates: neighbours?.estimates[i] ?? [],
      })
      if (!standing) return
      const truth = farm.turbines[i]!.truth.standingDeg
      const [low, high] = standing.standingInterval95Deg
      own.push(standing.standingDeg - truth)
      widths.push(high - low)
      scores.push(high - low + 40 * Math.max(0, low - truth) + 40 * Math.max(0, truth - high))
      if (low <= truth && truth <= high) covered++
      const called =
        verdictOf(standing.standingDeg, [low, high], settings.actionThresholdDeg).verdict === 'offset'
      if (Math.abs(truth) <= 2) {
        small++
        if (called) smallCalled++
      }
      if (Math.abs(truth) >= 4.5) {
        large++
        if (called) largeFound++
      }
    })
    const common = mean(own)
    errors.push(...own)
    rmse.push(Math.sqrt(mean(own.map((error) => error ** 2))))
    apart.push(Math.sqrt(mean(own.map((error) => (error - common) ** 2))))
  }
  const share = (part: number, of: number): string =>
    of > 0 ? `${((100 * part) / of).toFixed(1)} % of ${of}` : '-'
  return (
    `| ${name} | ${errors.length} | ${mean(errors).toFixed(2)} | ${Math.sqrt(mean(errors.map((e) => e ** 2))).toFixed(2)} | ` +
    `${median(rmse).toFixed(2)} | ${median(apart).toFixed(2)} | ${((100 * covered) / errors.length).toFixed(1)} % | ${median(widths).toFixed(2)} | ` +
    `${mean(scores).toFixed(2)} | ${share(smallCalled, small)} | ${share(largeFound, large)} |`
  )
}

function mean(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length
}

function median(values: readonly number[]): number {
  return [...values].sort((a, b) => a - b)[values.length >> 1]!
}
