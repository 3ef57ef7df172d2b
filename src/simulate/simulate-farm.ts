import { turbineInflow } from './inflow.ts'
import { turbineOrders } from './operation.ts'
import { PURPOSE, RandomStream } from './random.ts'
import { emptyRows, STATES, type TurbineRows } from './rows.ts'
import { faultsOf, type FaultKind } from './faults.ts'
import { runTurbine, type TurbineRun } from './run-turbine.ts'
import { farmScenario, scenarioSeconds, type FarmScenario } from './scenario.ts'
import { offsetSteps, planTurbines, type TurbinePlan } from './turbine-plan.ts'
import type { TurbineSums } from './turbine-sums.ts'
import { farmWeather, PAD_MIN } from './weather.ts'

/** A fault as it was put into the farm. */
export interface FaultTruth {
  kind: FaultKind
  fromS: number
  /** End of the fault, or of the window where that comes first. */
  toS: number
  /** What `FAULTS` says of the kind; null: it has no such number. */
  size: number | null
  place: number | null
}

/** What is true of one turbine, and what no log shows. */
export interface TurbineTruth extends TurbineSums {
  turbine: string
  /** d of the vane as logged: k g = v + d. At the start; `offsets` has the later ones. */
  offsetDeg: number
  /** Mean yaw error that the controller holds, d / k of its own vane: what a technician would have to correct. */
  standingDeg: number
  /** Both, from a second of the window on; one entry when nothing changes. */
  offsets: { fromS: number; offsetDeg: number; standingDeg: number }[]
  /** Corrections of the vane offset: what the site file says was added to the controller's vane, and what was. */
  corrections: { atS: number; recordedDeg: number; addedDeg: number }[]
  faults: FaultTruth[]
  /** When the error of the nacelle position took another value of its own accord, and by how much: lost zeros and jumps. */
  nacelleSteps: { atS: number; stepDeg: number }[]
  correctionDeg: number
  responsePerDeg: number
  anemometerGain: number
  northOffsetDeg: number
  eastingM: number
  northingM: number
}

/** The log of one turbine in columns (every array: one entry for each row), and its truth. */
export interface SimulatedTurbine extends TurbineRows {
  turbine: string
  /** Status as logged, one of STATES. */
  status: string[]
  truth: TurbineTruth
}

export interface SimulatedFarm {
  scenario: FarmScenario
  turbines: SimulatedTurbine[]
}

/**
 * A wind farm in weather, in steps of 1 s, as rows of `rateS` seconds. The same scenario gives the same numbers; no
 * clock and no foreign random source is read. Memory: 21 numbers a row.
 *
 * @throws InputError OUT_OF_RANGE, LENGTH_MISMATCH
 */
export function simulateFarm(given: Partial<FarmScenario> = {}): SimulatedFarm {
  const scenario = farmScenario(given)
  const weather = farmWeather(scenario)
  const plans = planTurbines(scenario)
  const orders = plans.map((plan) => turbineOrders(scenario, plan.index))
  const rowCount = scenarioSeconds(scenario) / scenario.rateS
  const turbines = plans.map((plan): SimulatedTurbine => {
    const inflow = turbineInflow(scenario, weather, plans, orders, plan.index)
    const rows = emptyRows(scenario.startMs, scenario.rateS, rowCount)
    const run = runTurbine(scenario, plan, inflow, orders[plan.index]!, rows)
    const logger = new RandomStream(scenario.seed, PURPOSE.logger, plan.index)
    addAir(rows, scenario, weather, logger)
    if (scenario.references.includes(plan.index)) addReference(rows, logger)
    return {
      ...rows,
      turbine: plan.name,
      status: Array.from(rows.state, (code) => STATES[code]!),
      truth: truthOf(scenario, plan, run),
    }
  })
  return { scenario, turbines }
}

/** Thermometer and barometer of one nacelle, with a constant error of their own (0.3 degrees, 0.5 hPa rms). */
function addAir(
  rows: TurbineRows,
  scenario: FarmScenario,
  weather: ReturnType<typeof farmWeather>,
  logger: RandomStream,
): void {
  const warm = 0.3 * logger.normal()
  const high = 0.5 * logger.normal()
  for (let row = 0; row < rows.timeMs.length; row++) {
    const minute = PAD_MIN + Math.floor(((row + 0.5) * scenario.rateS) / 60)
    rows.columns.air_temperature[row] = weather.temperatureC[minute]! + warm + 0.05 * logger.normal()
    rows.columns.air_pressure[row] = weather.pressureHpa[minute]! + high + 0.05 * logger.normal()
  }
}

/** A reference on the nacelle that looks ahead: noise of a row 0.3 degrees and 1 %, no offset. */
function addReference(rows: TurbineRows, logger: RandomStream): void {
  for (let row = 0; row < rows.timeMs.length; row++) {
    rows.columns.reference_yaw_error[row] = rows.trueYawErrorDeg[row]! + 0.3 * logger.normal()
    rows.columns.reference_wind_speed[row] = rows.trueRotorWindMs[row]! * (1 + 0.01 * logger.normal())
  }
}

function truthOf(scenario: FarmScenario, plan: TurbinePlan, run: TurbineRun): TurbineTruth {
  const before = scenario.vaneLogged === 'beforeCorrection'
  let correctionDeg = before ? plan.correctionDeg : 0
  let controllerDeg = plan.offsetDeg
  const period = (fromS: number) => ({
    fromS,
    offsetDeg: controllerDeg + correctionDeg,
    standingDeg: controllerDeg / scenario.vaneGain,
  })
  const offsets = [period(0)]
  const steps = offsetSteps(scenario, plan)
  for (const { atS, toDeg, addedDeg } of steps) {
    if (before) correctionDeg += addedDeg
    controllerDeg = toDeg
    offsets.push(period(atS))
  }
  const endS = scenarioSeconds(scenario)
  return {
    turbine: plan.name,
    offsetDeg: offsets[0]!.offsetDeg,
    standingDeg: offsets[0]!.standingDeg,
    offsets,
    corrections: steps.flatMap(({ atS, recordedDeg, addedDeg }) =>
      recordedDeg === null ? [] : [{ atS, recordedDeg, addedDeg }],
    ),
    faults: faultsOf(scenario.faults, plan.index).map(({ kind, fromS, toS, size, place }) => ({
      kind,
      fromS,
      toS: Math.min(toS, endS),
      size,
      place,
    })),
    nacelleSteps: [...run.nacelleSteps],
    correctionDeg: plan.correctionDeg,
    responsePerDeg: plan.responsePerDeg,
    anemometerGain: plan.anemometerGain,
    northOffsetDeg: plan.northOffsetDeg,
    eastingM: plan.eastingM,
    northingM: plan.northingM,
    ...run.sums,
  }
}
