/**
 * Scoring a farm of 25 turbines over 90 days of 10-minute rows, on one thread and with two worker threads as the service has: frame, comparison of neighbours, 1000 resamples of
 * each block length and all questions included. In seconds (at most 10), and as a ratio to plain work in the same run:
 * sorting a Float64Array of 1,000,000. The comparison is also timed by itself. Worker threads load dist/: build first.
 */
import { compareNeighbours, dayBlocks } from '../../src/analysis/index.ts'
import { openScorers } from '../../src/replay/scorers.ts'
import { scoreFarm } from '../../src/replay/score-farm.ts'
import type { ScoreSheet } from '../../src/sheet/index.ts'
import { farmScenario } from '../../src/simulate/index.ts'
import { cachedFarm, columnsOf, frameOf, siteOf, STUDY_SETTINGS } from '../study/simulated-farms.ts'

const RUNS = 3

export async function benchFarm(print: (text: string) => void): Promise<void> {
  const settings = { ...STUDY_SETTINGS, resamples: 1000 }
  const farm = cachedFarm(farmScenario({ seed: 78, turbines: 25, days: 90 }))
  const request = {
    replay: 'bench',
    version: 'bench',
    site: siteOf(farm),
    settings,
    receipt: {
      warnings: [],
      intervalS: farm.scenario.rateS,
      inputs: [],
    } as unknown as ScoreSheet['receipt'],
    reading: {},
  }
  const scorers = openScorers(0)
  const workers = openScorers(2)
  const frame = frameOf(farm, settings)
  const days = frame.calendar.days
  const numbers = Float64Array.from({ length: 1_000_000 }, (_, i) => (i * 7919) % 1_000_003)
  const whole: number[] = []
  const shared: number[] = []
  const compared: number[] = []
  const ratios: number[] = []
  for (let k = 0; k < RUNS; k++) {
    const scoring = await elapsedMs(() => scoreFarm(columnsOf(farm), request, scorers))
    shared.push(await elapsedMs(() => scoreFarm(columnsOf(farm), request, workers)))
    const sorting = await elapsedMs(() => numbers.slice().sort())
    compared.push(await elapsedMs(() => compareNeighbours(frame, days, dayBlocks(days, settings), settings)))
    whole.push(scoring)
    ratios.push(scoring / sorting)
  }
  await scorers.close()
  await workers.close()
  print(
    `scoring 25 turbines over 90 days (${farm.turbines.length * farm.turbines[0]!.timeMs.length} rows): ` +
      `median ${(median(shared) / 1000).toFixed(1)} s with two worker threads (at most 10), ${(median(whole) / 1000).toFixed(1)} s on one thread, of which ${(median(compared) / 1000).toFixed(1)} s to compare neighbours; ` +
      `${median(ratios).toFixed(0)} x sorting a million numbers`,
  )
}

async function elapsedMs(work: () => unknown): Promise<number> {
  const start = performance.now()
  await work()
  return performance.now() - start
}

function median(values: readonly number[]): number {
  return [...values].sort((a, b) => a - b)[values.length >> 1]!
}
