/**
 * How good are offsets where the anemometers are honest and that is known? Monte Carlo over simulated farms with known
 * truth: error, coverage of the 95 % interval, width. Not part of `npm test`.
 *
 *   npm run study -- honest [farms]
 */
import { dayBlocks, staticOffset } from '../../src/analysis/index.ts'
import { farmScenario, randomScenario, type FarmScenario } from '../../src/simulate/index.ts'
import { cachedFarm, frameOf, STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 5000

export interface StudyLine {
  readonly name: string
  readonly farms: number
  readonly turbines: number
  readonly medianRmse: number
  readonly p90Rmse: number
  readonly bias: number
  readonly coverage: number
  readonly medianWidth: number
}

export function honestAnemometers(farms: number, print: (text: string) => void): void {
  const strata: [string, (seed: number) => FarmScenario][] = [
    ['one kind of farm, other weather', (seed) => farmScenario({ seed, turbines: 6, days: 30 })],
    ['farms that differ in all', (seed) => randomScenario(seed, { turbines: 6, days: 30 })],
  ]
  print(
    '| farms of 6, 30 days, response known to be 0, exponent 3 | farms | RMSE median | RMSE 90 % | bias | coverage | width median |',
  )
  print('|---|---|---|---|---|---|---|')
  for (const [name, scenarioOf] of strata) {
    const line = stratum(name, farms, scenarioOf)
    print(
      `| ${line.name} | ${line.farms} | ${line.medianRmse.toFixed(2)} | ${line.p90Rmse.toFixed(2)} | ${line.bias.toFixed(2)} | ` +
        `${(100 * line.coverage).toFixed(1)} % | ${line.medianWidth.toFixed(2)} |`,
    )
  }
}

function stratum(name: string, farms: number, scenarioOf: (seed: number) => FarmScenario): StudyLine {
  const settings = { ...STUDY_SETTINGS, assumedResponsePctPerDeg: 0, exponentLow: 3, exponentHigh: 3 }
  const rmse: number[] = []
  const widths: number[] = []
  const errors: number[] = []
  let covered = 0
  for (let k = 0; k < farms; k++) {
    const farm = cachedFarm(scenarioOf(FIRST_SEED + k))
    const frame = frameOf(farm, settings)
    const days = frame.calendar.days
    const dayWeights = dayBlocks(days, settings)
    let squares = 0
    frame.turbines.forEach((turbine, i) => {
      const { sheet } = staticOffset(turbine, { settings, dayWeights, days })
      const truth = farm.turbines[i]!.truth.offsetDeg
      const error = (sheet.estimateDeg ?? NaN) - truth
      const [low, high] = sheet.interval95Deg as [number, number]
      squares += error * error
      errors.push(error)
      widths.push(high - low)
      if (low <= truth && truth <= high) covered++
    })
    rmse.push(Math.sqrt(squares / frame.turbines.length))
  }
  return {
    name,
    farms,
    turbines: errors.length,
    medianRmse: at(rmse, 0.5),
    p90Rmse: at(rmse, 0.9),
    bias: errors.reduce((sum, error) => sum + error, 0) / errors.length,
    coverage: covered / errors.length,
    medianWidth: at(widths, 0.5),
  }
}

/** Order statistic at (n - 1) q, rounded to the next one. */
function at(values: readonly number[], q: number): number {
  return [...values].sort((a, b) => a - b)[Math.round((values.length - 1) * q)]!
}
