/**
 * Do the halves of one season agree? Farms of 9 over 90 days whose offsets stay: each half is scored as a log of its own.
 * Repeatability only: an error that both halves share does not show. Not part of `npm test`.
 *
 *   npm run study -- halves [farms]
 */
import { compareNeighbours, dayBlocks, staticOffset } from '../../src/analysis/index.ts'
import { farmScenario, type SimulatedFarm } from '../../src/simulate/index.ts'
import { cachedFarm, frameOf, STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 61300
const DAYS = 90
const TURBINES = 9

export function halvesStudy(farms: number, print: (text: string) => void): void {
  const medians: number[] = []
  const all: number[] = []
  for (let k = 0; k < farms; k++) {
    const farm = cachedFarm(
      farmScenario({
        seed: FIRST_SEED + k,
        turbines: TURBINES,
        days: DAYS,
        anemometerResponsePerDeg: -0.003,
        anemometerResponseSpread: 0.0003,
      }),
    )
    const [first, second] = [misalignments(half(farm, 0)), misalignments(half(farm, 1))]
    const apart = first
      .map((value, i) => Math.abs(value - second[i]!))
      .filter((value) => !Number.isNaN(value))
    medians.push(median(apart))
    all.push(...apart)
  }
  print(
    `Halves of ${DAYS} days, ${farms} farms of ${TURBINES}: m differs by ${median(medians).toFixed(2)} degrees (median over a farm; median of farms), ` +
      `largest such median ${Math.max(...medians).toFixed(2)}, of all turbines nine tenths within ${quantile(all, 0.9).toFixed(2)}`,
  )
}

/** m of every turbine, NaN where there is none. */
function misalignments(farm: SimulatedFarm): number[] {
  const settings = STUDY_SETTINGS
  const frame = frameOf(farm, settings)
  const days = frame.calendar.days
  const dayWeights = dayBlocks(days, settings)
  const neighbours = compareNeighbours(frame, days, dayWeights, settings)
  return frame.turbines.map(
    (turbine, i) =>
      staticOffset(turbine, {
        settings,
        dayWeights,
        days,
        response: neighbours?.response.turbines[i] ?? null,
        farmEstimates: neighbours?.estimates[i] ?? [],
      }).standing?.standingDeg ?? NaN,
  )
}

function half(farm: SimulatedFarm, which: 0 | 1): SimulatedFarm {
  const turbines = farm.turbines.map((turbine) => {
    const middle = turbine.timeMs.length >> 1
    const [from, to] = which === 0 ? [0, middle] : [middle, turbine.timeMs.length]
    return {
      ...turbine,
      timeMs: turbine.timeMs.slice(from, to),
      status: turbine.status.slice(from, to),
      columns: Object.fromEntries(
        Object.entries(turbine.columns).map(([name, values]) => [name, values.slice(from, to)]),
      ),
    }
  })
  return { ...farm, turbines: turbines as unknown as SimulatedFarm['turbines'] }
}

function median(values: readonly number[]): number {
  return quantile(values, 0.5)
}

function quantile(values: readonly number[], q: number): number {
  const sorted = [...values].sort((a, b) => a - b)
  return sorted[Math.round(q * (sorted.length - 1))] ?? NaN
}
