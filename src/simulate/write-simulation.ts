import { createWriteStream } from 'node:fs'
import { mkdir, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { Readable } from 'node:stream'
import { pipeline } from 'node:stream/promises'
import { createGzip } from 'node:zlib'
import type { SiteFile } from '../sheet/index.ts'
import { FAULTS } from './faults.ts'
import { emptyAccount, logCsv, type LogAccount } from './log-csv.ts'
import type { FarmScenario } from './scenario.ts'
import { simulateFarm, type SimulatedFarm } from './simulate-farm.ts'

/** The site file of a made-up farm: what an operator would know, nothing of the truth. */
export function siteFileOf(farm: SimulatedFarm): SiteFile {
  const { scenario, turbines } = farm
  return {
    site: scenario.site,
    timezone: scenario.timezone,
    stamp: 'begin',
    intervalS: scenario.rateS,
    runningStatus: ['run'],
    turbines: turbines.map(({ turbine, truth }) => ({
      turbine,
      model: scenario.model,
      ratedPowerKw: scenario.ratedPowerKw,
      rotorDiameterM: scenario.rotorDiameterM,
      hubHeightM: scenario.hubHeightM,
      altitudeM: scenario.altitudeM,
      eastingM: truth.eastingM,
      northingM: truth.northingM,
      vane: { logged: scenario.vaneLogged, correctionDeg: truth.correctionDeg, sign: 1 as const },
      nacelle: { northOffsetSource: 'unknown' as const },
    })),
    corrections: turbines.flatMap(({ turbine, truth }) =>
      truth.corrections.map(({ atS, recordedDeg }) => ({
        turbine,
        at: isoTime(farm, atS),
        enteredDeg: rounded(recordedDeg),
      })),
    ),
  }
}

/** What no log shows, as a document: the scenario, what was wrong with which turbine, the account of the log's lines, each turbine's truth. */
export function truthDocument(farm: SimulatedFarm, log: LogAccount) {
  return {
    note: 'Invented data: a made-up wind farm in made-up weather.',
    scenario: farm.scenario,
    faults: farm.turbines.flatMap(({ turbine, truth }) =>
      truth.faults.map(({ kind, fromS, toS, size, place }) => ({
        turbine,
        sensor: FAULTS[kind].sensor,
        kind,
        from: isoTime(farm, fromS),
        to: isoTime(farm, toS),
        size,
        place,
        means: FAULTS[kind].does,
      })),
    ),
    corrections: farm.turbines.flatMap(({ turbine, truth }) =>
      truth.corrections.map(({ atS, recordedDeg, addedDeg }) => ({
        turbine,
        at: isoTime(farm, atS),
        recordedDeg: rounded(recordedDeg),
        addedDeg: rounded(addedDeg),
      })),
    ),
    log,
    turbines: farm.turbines.map(({ truth }) =>
      Object.fromEntries(
        Object.entries(truth).map(([name, value]) => [
          name,
          typeof value === 'number' ? finite(value) : value,
        ]),
      ),
    ),
  }
}

/** Where the three files of a simulation lie. */
export interface WrittenSimulation {
  logPath: string
  sitePath: string
  truthPath: string
  account: LogAccount
}

/**
 * Simulates a farm and writes its log (`SITE-YYYY-MM.csv.gz`), its site file (`SITE.site.json`) and its truth
 * (`SITE.truth.json`) into a folder, which is made when it is not there. Files of the same name are replaced.
 *
 * @throws InputError as `simulateFarm`
 */
export async function writeSimulation(
  given: Partial<FarmScenario>,
  folder: string,
): Promise<WrittenSimulation> {
  const farm = simulateFarm(given)
  const { site, startMs } = farm.scenario
  const month = new Date(startMs).toISOString().slice(0, 7)
  const logPath = join(folder, `${site}-${month}.csv.gz`)
  const sitePath = join(folder, `${site}.site.json`)
  const truthPath = join(folder, `${site}.truth.json`)
  await mkdir(folder, { recursive: true })
  const account = emptyAccount()
  await pipeline(Readable.from(logCsv(farm, account)), createGzip({ level: 9 }), createWriteStream(logPath))
  await writeFile(sitePath, JSON.stringify(siteFileOf(farm), null, 2) + '\n')
  await writeFile(truthPath, JSON.stringify(truthDocument(farm, account), null, 2) + '\n')
  return { logPath, sitePath, truthPath, account }
}

function isoTime(farm: SimulatedFarm, second: number): string {
  return new Date(farm.scenario.startMs + second * 1000).toISOString()
}

/** Six decimals are more than any use of the truth needs, and the same on every machine. */
function rounded(value: number): number {
  return Math.round(value * 1e6) / 1e6
}

function finite(value: number): number | null {
  return Number.isFinite(value) ? rounded(value) : null
}
