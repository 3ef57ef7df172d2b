import { createHash } from 'node:crypto'
import { existsSync, mkdirSync, readdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import v8 from 'node:v8'
import { buildFrame, type Frame, type TurbineColumns } from '../../src/frame/index.ts'
import { simulateFarm, type FarmScenario, type SimulatedFarm } from '../../src/simulate/index.ts'
import type { ScoringSettings, SiteFile } from '../../src/sheet/index.ts'

/** Where made-up farms and worked-out results are kept; not committed. */
export const CACHE = join(import.meta.dirname, '..', '..', '.cache', 'study')

/** Settings of a study: the defaults of config.ts, the response taken as known, fewer resamples for speed. */
export const STUDY_SETTINGS: ScoringSettings = {
  exponent: 3,
  exponentLow: 1.4,
  exponentHigh: 3,
  actionThresholdDeg: 3,
  resamples: 500,
  seed: 1,
  assumedResponsePctPerDeg: null,
  responseSpreadPctPerDeg: 0.15,
  windMinMs: 4.5,
  vaneMaxDeg: 15,
  yawMoveMaxDeg: 5,
  fastDirectionDeg: 10,
  fastSpeedMs: 2,
  minimumRows: 150,
  minimumDays: 5,
}

/** A simulated farm, from the cache on disk when the same scenario was made before by the same simulator. */
export function cachedFarm(scenario: FarmScenario): SimulatedFarm {
  return cached(JSON.stringify(scenario), () => simulateFarm(scenario))
}

/** What was made of the simulator before, from the cache on disk. */
export function cached<T>(key: string, make: () => T): T {
  const name = createHash('sha256').update(simulator()).update(key).digest('hex').slice(0, 24)
  const file = join(CACHE, `${name}.bin`)
  if (existsSync(file)) return v8.deserialize(readFileSync(file)) as T
  const made = make()
  mkdirSync(CACHE, { recursive: true })
  writeFileSync(`${file}.part`, v8.serialize(made))
  renameSync(`${file}.part`, file)
  return made
}

/** The simulator's sources: a farm made by another simulator is another farm. */
export function simulator(): string {
  const folder = join(import.meta.dirname, '..', '..', 'src', 'simulate')
  return readdirSync(folder)
    .sort()
    .map((name) => readFileSync(join(folder, name), 'utf8'))
    .join('\n')
}

/** The frame as the program would build it from the farm's log and site file. */
export function frameOf(farm: SimulatedFarm, settings: ScoringSettings): Frame {
  return buildFrame(columnsOf(farm), { settings, intervalS: farm.scenario.rateS, site: siteOf(farm) })
}

/** The rows of a farm with all the decimals that the simulator has. */
export function columnsOf(farm: SimulatedFarm): TurbineColumns[] {
  return farm.turbines.map((turbine) => ({
    turbine: turbine.turbine,
    time: turbine.timeMs,
    numbers: turbine.columns,
    texts: { status: turbine.status },
  }))
}

/** The site file of a farm, signs stated. */
export function siteOf({ scenario, turbines }: SimulatedFarm): SiteFile {
  return {
    timezone: scenario.timezone,
    runningStatus: ['run', 'limited'],
    turbines: turbines.map((turbine) => ({
      turbine: turbine.turbine,
      model: scenario.model,
      ratedPowerKw: scenario.ratedPowerKw,
      rotorDiameterM: scenario.rotorDiameterM,
      hubHeightM: scenario.hubHeightM,
      altitudeM: scenario.altitudeM,
      eastingM: turbine.truth.eastingM,
      northingM: turbine.truth.northingM,
      vane: { logged: scenario.vaneLogged, sign: 1 as const },
    })),
  }
}
