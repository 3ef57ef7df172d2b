/**
 * What do yaw moves alone tell of one turbine's offset? Monte Carlo over months of 1 Hz rows of a single turbine: true
 * offsets 0, 5 and -7, wind speed and direction linked or not, an anemometer that answers to the vane or not (which must
 * not matter: only the steepness of the curve rests on it). Not part of `npm test`; about 20 s a turbine.
 *
 *   npm run study -- moves [turbines]
 */
import {
  DAY_MARGIN_MS,
  DAY_MS,
  dayBlocks,
  examineDay,
  HIGH_RATE_CHANNELS,
  highRateRows,
  preferYawMoves,
  staticOffset,
  type HighRateRecord,
} from '../../src/analysis/index.ts'
import { buildFrame, type TurbineColumns, type TurbineFrame } from '../../src/frame/index.ts'
import { circularMean } from '../../src/kernel/angle/index.ts'
import { simulateFarm, STATES, type RowColumn, type SimulatedTurbine } from '../../src/simulate/index.ts'
import { STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 8000
const DAYS = 30
const DAY_S = 86_400
const INTERVAL_S = 600
const LINKS = [0, 0.2, -0.2] as const
const OFFSETS_DEG = [0, 5, -7] as const
const RESPONSES_PER_DEG = [0, -0.003] as const

interface Case {
  readonly link: number
  readonly offsetDeg: number
  readonly responsePerDeg: number
  readonly errorDeg: number
  readonly halfWidthDeg: number
  readonly moves: number
}

export function yawMoveStudy(turbines: number, print: (text: string) => void): void {
  const cases: Case[] = []
  for (let k = 0; k < turbines; k++) cases.push(caseOf(k))
  print('| one turbine, 30 days at 1 Hz | turbines | bias | RMSE | coverage | half-width mean | moves |')
  print('|---|---|---|---|---|---|---|')
  const line = (name: string, chosen: readonly Case[]): void => {
    if (chosen.length === 0) return
    const mean = (valueOf: (one: Case) => number): number =>
      chosen.reduce((sum, one) => sum + valueOf(one), 0) / chosen.length
    const covered = mean((one) => (Math.abs(one.errorDeg) <= one.halfWidthDeg ? 1 : 0))
    print(
      `| ${name} | ${chosen.length} | ${mean((one) => one.errorDeg).toFixed(2)} | ` +
        `${Math.sqrt(mean((one) => one.errorDeg ** 2)).toFixed(2)} | ${(100 * covered).toFixed(1)} % | ` +
        `${mean((one) => one.halfWidthDeg).toFixed(2)} | ${mean((one) => one.moves).toFixed(0)} |`,
    )
  }
  line('all', cases)
  for (const link of LINKS)
    line(
      `link ${link}`,
      cases.filter((one) => one.link === link),
    )
  for (const offset of OFFSETS_DEG)
    line(
      `d ${offset}`,
      cases.filter((one) => one.offsetDeg === offset),
    )
  for (const response of RESPONSES_PER_DEG) {
    line(
      `response ${100 * response} % per degree`,
      cases.filter((one) => one.responsePerDeg === response),
    )
  }
}

function caseOf(k: number): Case {
  const link = LINKS[k % 3]!
  const offsetDeg = OFFSETS_DEG[Math.floor(k / 3) % 3]!
  const responsePerDeg = RESPONSES_PER_DEG[Math.floor(k / 9) % 2]!
  const { scenario, turbines } = simulateFarm({
    turbines: 1,
    days: DAYS,
    rateS: 1,
    seed: FIRST_SEED + k,
    offsetsDeg: [offsetDeg],
    linkCorrelation: link,
    anemometerResponsePerDeg: responsePerDeg,
  })
  const turbine = turbines[0]!
  const settings = {
    ...STUDY_SETTINGS,
    exponent: scenario.exponent,
    exponentLow: scenario.exponent,
    exponentHigh: scenario.exponent,
    resamples: 500,
  }
  const frame = buildFrame([intervalsOf(turbine)], {
    site: { turbines: [{ turbine: turbine.turbine, ratedPowerKw: scenario.ratedPowerKw }] },
    settings,
    intervalS: INTERVAL_S,
  })
  const dayWeights = dayBlocks(frame.calendar.days, settings)
  const { sheet } = preferYawMoves(
    staticOffset(frame.turbines[0]!, { settings, dayWeights, days: frame.calendar.days }),
    recordOf(turbine, frame.turbines[0]!),
    { settings, dayWeights, days: frame.calendar.days, hasNeighbours: false },
  )
  const [low, high] = sheet.interval95GivenExponentDeg
  return {
    link,
    offsetDeg,
    responsePerDeg,
    errorDeg: sheet.estimateDeg! - offsetDeg,
    halfWidthDeg: (high! - low!) / 2,
    moves: sheet.rows,
  }
}

/** The rows themselves, as a replay looks at them. */
function recordOf({ turbine, timeMs, columns }: SimulatedTurbine, frame: TurbineFrame): HighRateRecord {
  const days = Array.from({ length: DAYS }, (_, day) => {
    const from = Math.max(0, day * DAY_S - DAY_MARGIN_MS / 1000)
    const to = (day + 1) * DAY_S + DAY_MARGIN_MS / 1000
    const numbers = Object.fromEntries(
      HIGH_RATE_CHANNELS.flatMap((name) =>
        name in columns ? [[name, columns[name as RowColumn].slice(from, to)]] : [],
      ),
    )
    const span = { time: timeMs.slice(from, to), numbers }
    return examineDay(highRateRows(frame, timeMs[0]! + day * DAY_MS, span))
  })
  return { turbine, days }
}

/** Ten-minute means of the channels that matter, as a replay reduces them. */
function intervalsOf({ turbine, timeMs, columns, state }: SimulatedTurbine): TurbineColumns {
  const n = Math.floor(timeMs.length / INTERVAL_S)
  const over = (values: Float64Array, mean: (part: Float64Array) => number): Float64Array =>
    Float64Array.from({ length: n }, (_, i) => mean(values.subarray(i * INTERVAL_S, (i + 1) * INTERVAL_S)))
  const plain = (part: Float64Array): number => part.reduce((sum, value) => sum + value, 0) / part.length
  const turned = (part: Float64Array): number => circularMean(part).direction
  const { wind_speed, power, pitch, rotor_speed, power_limit, vane, nacelle_position } = columns
  return {
    turbine,
    time: Float64Array.from({ length: n }, (_, i) => timeMs[i * INTERVAL_S]!),
    numbers: {
      ...Object.fromEntries(
        Object.entries({ wind_speed, power, pitch, rotor_speed, power_limit }).map(([name, values]) => [
          name,
          over(values, plain),
        ]),
      ),
      vane: over(vane, turned),
      nacelle_position: over(nacelle_position, turned),
      power_min: over(power, (part) => part.reduce((least, value) => Math.min(least, value), Infinity)),
    },
    texts: { status: Array.from({ length: n }, (_, i) => STATES[state[i * INTERVAL_S]!]!) },
  }
}
