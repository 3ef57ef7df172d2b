/**
 * How good are offsets where the response of the anemometers is not known and neighbours have to tell it? Monte Carlo over
 * strata of simulated farms with known truth. Not part of `npm test`. Farms that were worked out by the same sources are
 * taken from .cache/study, so that a run can be cut off and resumed; strata take turns, farm by farm.
 *
 *   npm run study -- neighbours [turbines of a stratum, 200 unless given]
 */
import { createHash } from 'node:crypto'
import { appendFileSync, existsSync, mkdirSync, readdirSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { compareNeighbours, dayBlocks, staticOffset, verdictOf } from '../../src/analysis/index.ts'
import { cachedFarm, CACHE, frameOf, STUDY_SETTINGS } from './simulated-farms.ts'
import { farmOf, STRATA, type Stratum } from './neighbour-strata.ts'

/** The estimator's and the simulator's folders: with another source a farm is worked out anew. */
const SOURCES = ['analysis', 'frame', 'kernel', 'simulate'] as const
/** Farms of a stratum that are worked out before the next stratum has its turn. */
const TURN = 4

interface TurbineResult {
  readonly truthDeg: number
  readonly estimateDeg: number
  readonly interval: readonly [number, number]
  readonly givenExponent: readonly [number, number]
  readonly called: boolean
  /** With the response given exactly; null: not worked out. */
  readonly floorDeg: number | null
}

interface FarmResult {
  readonly stratum: string
  readonly farm: number
  readonly turbines: readonly TurbineResult[]
}

export function neighboursStudy(turbines: number, print: (text: string) => void): void {
  const file = join(CACHE, `neighbours-${sourcesHash()}.jsonl`)
  const results = new Map<string, FarmResult>()
  if (existsSync(file)) {
    for (const line of readFileSync(file, 'utf8').split('\n').filter(Boolean)) {
      const result = JSON.parse(line) as FarmResult
      results.set(`${result.stratum} ${result.farm}`, result)
    }
  }
  mkdirSync(CACHE, { recursive: true })
  const farmsOf = (stratum: Stratum): number => Math.ceil(turbines / farmOf(stratum, 0).turbines)
  const most = Math.max(...STRATA.map(farmsOf))
  for (let from = 0; from < most; from += TURN) {
    for (const stratum of STRATA) {
      for (let k = from; k < Math.min(from + TURN, farmsOf(stratum)); k++) {
        const key = `${stratum.name} ${k}`
        if (results.has(key)) continue
        const result = farmResult(stratum, k)
        results.set(key, result)
        appendFileSync(file, `${JSON.stringify(result)}\n`)
      }
    }
  }
  printNeighbourTable([...results.values()], print)
}

function farmResult(stratum: Stratum, k: number): FarmResult {
  const settings = STUDY_SETTINGS
  const farm = cachedFarm(farmOf(stratum, k))
  const frame = frameOf(farm, settings)
  const days = frame.calendar.days
  const dayWeights = dayBlocks(days, settings)
  const neighbours = compareNeighbours(frame, days, dayWeights, settings)
  const turbines = frame.turbines.flatMap((turbine, i): TurbineResult[] => {
    const { truth } = farm.turbines[i]!
    const question = { settings, dayWeights, days }
    const { standing, disagreement } = staticOffset(turbine, {
      ...question,
      response: neighbours?.response.turbines[i] ?? null,
      farmEstimates: neighbours?.estimates[i] ?? [],
    })
    if (!standing) return []
    const { verdict } = verdictOf(
      standing.standingDeg,
      standing.standingInterval95Deg,
      settings.actionThresholdDeg,
    )
    const known = stratum.floor
      ? staticOffset(turbine, {
          ...question,
          settings: { ...settings, assumedResponsePctPerDeg: 100 * truth.responsePerDeg },
        }).standing
      : null
    return [
      {
        truthDeg: truth.standingDeg,
        estimateDeg: standing.standingDeg,
        interval: standing.standingInterval95Deg,
        givenExponent: standing.standingInterval95GivenExponentDeg,
        called: verdict === 'offset' && disagreement === null,
        floorDeg: known?.standingDeg ?? null,
      },
    ]
  })
  return { stratum: stratum.name, farm: k, turbines }
}

/** One line for each stratum, in the order of the strata; then all of them together at each size of the truth. */
function printNeighbourTable(results: readonly FarmResult[], print: (text: string) => void): void {
  print(
    '| stratum | turbines | bias | RMSE | of a farm, median | apart from its common error | coverage | with the exponent given | width median | ' +
      'with the exponent given | interval score | `offset` at 0 | at 1 | at 2 | at 5 |',
  )
  print('|---|---|---|---|---|---|---|---|---|---|---|---|---|---|---|')
  const lineOf = (name: string, farms: readonly FarmResult[]): void => {
    if (farms.length > 0) print(line(name, farms))
  }
  for (const stratum of STRATA) {
    const farms = results.filter((result) => result.stratum === stratum.name)
    lineOf(stratum.outside ? `${stratum.name} (not assumed)` : stratum.name, farms)
    if (stratum.floor) lineOf(`... were the response known exactly`, farms.map(withFloor))
  }
}

/** The same farm with the estimates that know the response; intervals and verdicts have no meaning. */
function withFloor(result: FarmResult): FarmResult {
  const turbines = result.turbines.flatMap((turbine) =>
    turbine.floorDeg === null
      ? []
      : [
          {
            ...turbine,
            estimateDeg: turbine.floorDeg,
            interval: [NaN, NaN] as const,
            givenExponent: [NaN, NaN] as const,
          },
        ],
  )
  return { ...result, turbines }
}

function line(name: string, farms: readonly FarmResult[]): string {
  const all = farms.flatMap(({ turbines }) => turbines)
  const errorOf = ({ estimateDeg, truthDeg }: TurbineResult): number => estimateDeg - truthDeg
  const errors = all.map(errorOf)
  const ofFarms = farms.map(({ turbines }) => turbines.map(errorOf))
  const apart = ofFarms.map((own) => rms(own.map((error) => error - mean(own))))
  const known = !Number.isNaN(all[0]!.interval[0])
  const coverage = (intervalOf: (turbine: TurbineResult) => readonly [number, number]): string => {
    const held = all.filter((turbine) => {
      const [low, high] = intervalOf(turbine)
      return low <= turbine.truthDeg && turbine.truthDeg <= high
    })
    return known ? `${((100 * held.length) / all.length).toFixed(1)} %` : '-'
  }
  const width = (intervalOf: (turbine: TurbineResult) => readonly [number, number]): string =>
    known ? median(all.map((turbine) => intervalOf(turbine)[1] - intervalOf(turbine)[0])).toFixed(2) : '-'
  const scores = all.map(
    ({ interval: [low, high], truthDeg }) =>
      high - low + 40 * Math.max(0, low - truthDeg) + 40 * Math.max(0, truthDeg - high),
  )
  const calledAt = (sizeDeg: number): string => {
    const there = all.filter(({ truthDeg }) => Math.abs(Math.abs(truthDeg) - sizeDeg) < 0.01)
    return known && there.length > 0
      ? `${there.filter(({ called }) => called).length} of ${there.length}`
      : '-'
  }
  const cells = [
    name,
    all.length,
    mean(errors).toFixed(2),
    rms(errors).toFixed(2),
    median(ofFarms.map(rms)).toFixed(2),
    median(apart).toFixed(2),
    coverage(({ interval }) => interval),
    coverage(({ givenExponent }) => givenExponent),
    width(({ interval }) => interval),
    width(({ givenExponent }) => givenExponent),
    known ? mean(scores).toFixed(2) : '-',
    ...[0, 1, 2, 5].map(calledAt),
  ]
  return `| ${cells.join(' | ')} |`
}

/** Marks the sources that a result rests on. */
function sourcesHash(): string {
  const hash = createHash('sha256').update(JSON.stringify(STUDY_SETTINGS))
  for (const folder of SOURCES) {
    const path = join(import.meta.dirname, '..', '..', 'src', folder)
    for (const name of readdirSync(path, { recursive: true, encoding: 'utf8' }).sort()) {
      if (name.endsWith('.ts')) hash.update(name).update(readFileSync(join(path, name)))
    }
  }
  return hash.digest('hex').slice(0, 12)
}

function mean(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length
}

function rms(values: readonly number[]): number {
  return Math.sqrt(mean(values.map((value) => value ** 2)))
}

function median(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b)
  return (sorted[(sorted.length - 1) >> 1]! + sorted[sorted.length >> 1]!) / 2
}
