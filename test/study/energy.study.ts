/**
 * Is the recoverable energy right, and does the list send people to the right turbines? Monte Carlo over simulated farms of 12
 * with offsets of a standard deviation of 4 degrees and known truth: error of the window's energy by turbine and farm,
 * coverage of its interval, and what the first five of the list hold of the energy of the truly best five. Not part of
 * `npm test`.
 *
 *   npm run study -- energy [farms]
 */
import {
  compareNeighbours,
  dayBlocks,
  energyLoss,
  staticOffset,
  verdictOf,
} from '../../src/analysis/index.ts'
import { outlooks } from '../../src/replay/outlook.ts'
import type { ScoringSettings, TurbineSheet } from '../../src/sheet/index.ts'
import { farmScenario, type FarmScenario } from '../../src/simulate/index.ts'
import { turbineExample } from '../http/sheet-example.ts'
import { normals } from '../kernel/stats/normals.ts'
import { cachedFarm, frameOf, STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 61_000
const TURBINES = 12
const OFFSET_SD_DEG = 4
const CHOSEN = 5
/** Of the truth, by turbine and by farm. */
const TURBINE_SHARE = 0.35
const FARM_SHARE = 0.15
const LEAST_DEG = 4

const KNOWN = { exponentLow: 3, exponentHigh: 3 } satisfies Partial<ScoringSettings>
const STRATA: readonly [string, number, Partial<ScoringSettings>, Partial<FarmScenario>][] = [
  ['30 days, response and exponent known', 30, { ...KNOWN, assumedResponsePctPerDeg: 0 }, {}],
  ['30 days, response by neighbours', 30, KNOWN, {}],
  ['30 days, response by neighbours, exponent doubted', 30, {}, {}],
  ['90 days, response and exponent known', 90, { ...KNOWN, assumedResponsePctPerDeg: 0 }, {}],
  ['90 days, response by neighbours', 90, KNOWN, {}],
]

export function energyStudy(farms: number, print: (text: string) => void): void {
  print(
    '| farms of 12, offsets of SD 4 | farms | turbines of 4 degrees or more | within 35 % | rms error | farms within 15 % | sum over truth | ' +
      'interval holds the truth | the list’s five hold of the best five: median, least | 95 % held |',
  )
  print('|---|---|---|---|---|---|---|---|---|---|')
  for (const [name, days, settings, scenario] of STRATA) {
    print(stratum(name, farms, { ...STUDY_SETTINGS, ...settings }, { days, ...scenario }))
  }
}

function stratum(
  name: string,
  farms: number,
  settings: ScoringSettings,
  overrides: Partial<FarmScenario>,
): string {
  const errors: number[] = []
  const sums: number[] = []
  const held: number[] = []
  let turbines = 0
  let covered = 0
  for (let k = 0; k < farms; k++) {
    const { sheets, truths } = farmOf(k, settings, overrides)
    let sum = 0
    let truthSum = 0
    sheets.forEach((sheet, i) => {
      const { windowMwh, windowInterval95Mwh } = sheet.energyLoss.static
      const { mwh, standingDeg } = truths[i]!
      const [low, high] = windowInterval95Mwh as [number, number]
      turbines++
      // A rotor that faces the wind to a tenth of a degree can lose a kilowatt hour by being turned: counted as nothing.
      if (low <= Math.max(0, mwh) && mwh <= high) covered++
      if (Math.abs(standingDeg) >= LEAST_DEG) errors.push((windowMwh ?? NaN) / mwh - 1)
      sum += windowMwh ?? NaN
      truthSum += mwh
    })
    sums.push(sum / truthSum)
    held.push(shareHeld(sheets, truths, settings))
  }
  const percent = (share: number): string => `${(100 * share).toFixed(1)} %`
  const within = (values: readonly number[], bound: number): number =>
    values.filter((value) => Math.abs(value) <= bound).length / values.length
  const rms = Math.sqrt(errors.reduce((total, error) => total + error * error, 0) / errors.length)
  const sorted = [...held].sort((a, b) => a - b)
  const cells = [
    name,
    farms,
    errors.length,
    percent(within(errors, TURBINE_SHARE)),
    percent(rms),
    percent(
      within(
        sums.map((ratio) => ratio - 1),
        FARM_SHARE,
      ),
    ),
    (sums.reduce((total, ratio) => total + ratio, 0) / sums.length).toFixed(3),
    `${percent(covered / turbines)} of ${turbines}`,
    `${percent(sorted[sorted.length >> 1]!)}, ${percent(sorted[0]!)}`,
    `${held.filter((share) => share >= 0.95).length} of ${farms}`,
  ]
  return `| ${cells.join(' | ')} |`
}

interface Truth {
  readonly mwh: number
  readonly standingDeg: number
}

function farmOf(k: number, settings: ScoringSettings, overrides: Partial<FarmScenario>) {
  const draw = normals(FIRST_SEED + k)
  const farm = cachedFarm(
    farmScenario({
      turbines: TURBINES,
      seed: FIRST_SEED + k,
      offsetsDeg: Array.from({ length: TURBINES }, () => OFFSET_SD_DEG * draw()),
      anemometerResponsePerDeg: settings.assumedResponsePctPerDeg === 0 ? 0 : -0.003,
      anemometerResponseSpread: settings.assumedResponsePctPerDeg === 0 ? 0 : 0.0003,
      layout: { columns: 4, spacingD: 5, rowSpacingD: 6, bearingDeg: (k * 37) % 180 },
      ...overrides,
    }),
  )
  const frame = frameOf(farm, settings)
  const days = frame.calendar.days
  const dayWeights = dayBlocks(days, settings)
  const neighbours =
    settings.assumedResponsePctPerDeg === null ? compareNeighbours(frame, days, dayWeights, settings) : null
  const sheets = frame.turbines.map((turbine, i): TurbineSheet => {
    const answer = staticOffset(turbine, {
      settings,
      dayWeights,
      days,
      response: neighbours?.response.turbines[i] ?? null,
      farmEstimates: neighbours?.estimates[i] ?? [],
    })
    const { standing } = answer
    const example = turbineExample(turbine.turbine)
    return {
      ...example,
      verdict: standing
        ? verdictOf(standing.standingDeg, standing.standingInterval95Deg, settings.actionThresholdDeg).verdict
        : 'undetermined',
      staticOffset: { ...example.staticOffset, ...answer.sheet },
      energyLoss: energyLoss(answer.frame, {
        exponent: settings.exponent,
        offset: standing,
        byExponent: answer.byExponent,
      }),
      outlook: null,
    }
  })
  const truths = farm.turbines.map(({ truth }): Truth => ({
    mwh: truth.lostStaticMwh,
    standingDeg: truth.standingDeg,
  }))
  return { sheets, truths }
}

/** Energy of the first five - those on the list by expected energy, then those without a verdict - over that of the best five. */
function shareHeld(
  sheets: readonly TurbineSheet[],
  truths: readonly Truth[],
  { actionThresholdDeg }: ScoringSettings,
): number {
  const expected = outlooks(sheets, actionThresholdDeg)
  const rank = (i: number): number =>
    sheets[i]!.verdict === 'offset' ? 2 : sheets[i]!.verdict === 'aligned' ? 0 : 1
  const chosen = sheets
    .map((_, i) => i)
    .sort(
      (a, b) =>
        rank(b) - rank(a) || (expected[b]?.expectedAnnualMwh ?? 0) - (expected[a]?.expectedAnnualMwh ?? 0),
    )
    .slice(0, CHOSEN)
  const sumOf = (mwh: readonly number[]): number => mwh.reduce((sum, one) => sum + one, 0)
  const best = truths
    .map(({ mwh }) => mwh)
    .sort((a, b) => b - a)
    .slice(0, CHOSEN)
  return sumOf(chosen.map((i) => truths[i]!.mwh)) / sumOf(best)
}
