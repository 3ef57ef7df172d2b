import {
  DAY_MARGIN_MS,
  DAY_MS,
  examineDay,
  HIGH_RATE_CHANNELS,
  highRateRows,
  type HighRateRecord,
} from '../../src/analysis/index.ts'
import type { TurbineFrame } from '../../src/frame/index.ts'
import { scoreFarm } from '../../src/replay/score-farm.ts'
import { openScorers } from '../../src/replay/scorers.ts'
import type { Receipt, ScoreSheet } from '../../src/sheet/index.ts'
import { faultsOf } from '../../src/simulate/faults.ts'
import { turbineInflow } from '../../src/simulate/inflow.ts'
import { emptyRows, STATES } from '../../src/simulate/rows.ts'
import { runTurbine } from '../../src/simulate/run-turbine.ts'
import { turbineOrders } from '../../src/simulate/operation.ts'
import { planTurbines } from '../../src/simulate/turbine-plan.ts'
import { farmWeather } from '../../src/simulate/weather.ts'
import {
  emptyAccount,
  farmScenario,
  logCsv,
  siteFileOf,
  type Fault,
  type FarmScenario,
  type SimulatedFarm,
  type SimulatedTurbine,
} from '../../src/simulate/index.ts'
import { cached, STUDY_SETTINGS } from './simulated-farms.ts'

/** Findings do not come from resamples; the response is taken as known, for speed. */
const SETTINGS = { ...STUDY_SETTINGS, resamples: 60, assumedResponsePctPerDeg: 0 }

/**
 * A farm that was made before, with faults at one of its turbines: only that one is made anew, since turbines do not hear
 * of one another's sensors. Not for faults that change the weather of the farm.
 *
 * @param keep  in the cache on disk: not for rows of a second
 */
export function withFaults(
  farm: SimulatedFarm,
  index: number,
  faults: readonly Fault[],
  changes: Partial<FarmScenario> = {},
  keep = true,
): SimulatedFarm {
  const scenario = farmScenario({
    ...farm.scenario,
    ...changes,
    faults: [...farm.scenario.faults, ...faults],
  })
  const make = () => madeAnew(scenario, farm.turbines[index]!, index)
  const turbine = keep ? cached(`${JSON.stringify(scenario)} ${index}`, make) : make()
  return {
    scenario,
    turbines: farm.turbines.map((one, i) => (i === index ? turbine : one)),
  }
}

function madeAnew(scenario: FarmScenario, sound: SimulatedTurbine, index: number): SimulatedTurbine {
  const weather = farmWeather(scenario)
  const plans = planTurbines(scenario)
  const orders = plans.map((plan) => turbineOrders(scenario, plan.index))
  const rows = emptyRows(scenario.startMs, scenario.rateS, sound.timeMs.length)
  const inflow = turbineInflow(scenario, weather, plans, orders, index)
  const { sums } = runTurbine(scenario, plans[index]!, inflow, orders[index]!, rows)
  for (const name of ['air_temperature', 'air_pressure'] as const) rows.columns[name] = sound.columns[name]
  return {
    ...rows,
    turbine: sound.turbine,
    status: Array.from(rows.state, (code) => STATES[code]!),
    truth: {
      ...sound.truth,
      ...sums,
      faults: faultsOf(scenario.faults, index).map(({ kind, fromS, toS, size, place }) => ({
        kind,
        fromS,
        toS,
        size,
        place,
      })),
    },
  }
}

/**
 * The score sheet of a farm, from the digits that its log holds.
 *
 * @param fine  the same farm in rows of a second; without it the log has the farm's own rows alone.
 */
export async function sheetOf(farm: SimulatedFarm, fine?: SimulatedFarm): Promise<ScoreSheet> {
  const request = {
    replay: 'study',
    version: 'study',
    site: siteFileOf(farm),
    settings: SETTINGS,
    receipt: { warnings: [], intervalS: farm.scenario.rateS, inputs: [] } as unknown as Receipt,
    reading: {},
    ...(fine === undefined
      ? {}
      : { examine: (frames: readonly TurbineFrame[]) => Promise.resolve(examined(frames, fine)) }),
  }
  return scoreFarm(
    farm.turbines.map((turbine) => loggedColumns(farm, turbine)),
    request,
    openScorers(0),
  )
}

/** What the rows of a second of a turbine told: a sound one is looked at once. */
const records = new WeakMap<SimulatedTurbine, HighRateRecord>()

function examined(frames: readonly TurbineFrame[], fine: SimulatedFarm): HighRateRecord[] {
  return frames.map((frame, i) => {
    const known = records.get(fine.turbines[i]!)
    if (known) return known
    const { turbine, time, numbers } = loggedColumns(fine, fine.turbines[i]!)
    const channels = HIGH_RATE_CHANNELS.filter((name) => name in numbers)
    const days: HighRateRecord['days'][number][] = []
    for (let dayMs = Math.floor(time[0]! / DAY_MS) * DAY_MS; dayMs < time.at(-1)!; dayMs += DAY_MS) {
      const inside = (_: number, row: number) =>
        time[row]! >= dayMs - DAY_MARGIN_MS && time[row]! < dayMs + DAY_MS + DAY_MARGIN_MS
      const span = {
        time: time.filter(inside),
        numbers: Object.fromEntries(channels.map((name) => [name, numbers[name]!.filter(inside)])),
      }
      days.push(examineDay(highRateRows(frame, dayMs, span)))
    }
    const record = { turbine, days }
    records.set(fine.turbines[i]!, record)
    return record
  })
}

/** What is read of the log of one turbine: its columns as numbers with the decimals that the log has. */
export function loggedColumns(farm: SimulatedFarm, turbine: SimulatedTurbine) {
  const { scenario } = farm
  const lines = logCsv({ scenario, turbines: [turbine] }, emptyAccount())
  const header = (lines.next().value as string).trim().split(',')
  const n = turbine.timeMs.length
  const columns = header.slice(2, -1).map((name) => ({ name, values: new Float64Array(n) }))
  let row = 0
  for (const line of lines) {
    const cells = line.split(',')
    for (const [i, { values }] of columns.entries()) {
      const cell = cells[i + 2]!
      values[row] = cell === '' ? NaN : Number(cell)
    }
    row++
  }
  return {
    turbine: turbine.turbine,
    time: turbine.timeMs,
    numbers: Object.fromEntries(columns.map(({ name, values }) => [name, values])),
    texts: { status: turbine.status },
  }
}
