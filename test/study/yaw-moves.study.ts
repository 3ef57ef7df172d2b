/**
 * What do yaw moves alone tell of one turbine's offset? Monte Carlo over months of 1 Hz rows of a single turbine: true
 * offsets 0, 5 and -7, wind speed and direction linked or not, an anemometer that answers to the vane or not (which must
 * not matter: only the steepness of the curve rests on it). Not part of `npm test`; about 20 s a turbine.
 *
 *   npm run study -- moves [turbines]
 */
import { steepnessByPower, yawMoveOffset } from '../../src/analysis/offset/yaw-move-offset.ts'
import { YawMoveWindows } from '../../src/analysis/offset/yaw-move-windows.ts'
import { dayBlocks } from '../../src/analysis/index.ts'
import { measuredPowerCurve, type MeasuredCurve } from '../../src/kernel/wind/index.ts'
import { simulateFarm, STATES, type SimulatedTurbine } from '../../src/simulate/index.ts'

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
  const answer = yawMoveOffset(windowsOf(turbine).rows, {
    exponent: scenario.exponent,
    ratedPowerKw: scenario.ratedPowerKw,
    steepnessAtPower: steepnessByPower(curveOf(turbine)),
    dayWeights: dayBlocks(DAYS, { resamples: 500, seed: 1 }),
    minimumDays: 5,
  })
  return {
    link,
    offsetDeg,
    responsePerDeg,
    errorDeg: answer.offsetDeg - offsetDeg,
    halfWidthDeg: answer.halfWidthDeg,
    moves: answer.moves,
  }
}

function windowsOf({ timeMs, columns, state }: SimulatedTurbine): YawMoveWindows {
  const windows = new YawMoveWindows()
  for (let day = 0; day < DAYS; day++) {
    const [from, to] = [day * DAY_S, (day + 1) * DAY_S]
    windows.add({
      timeMs: timeMs.subarray(from, to),
      vane: columns.vane.subarray(from, to),
      power: columns.power.subarray(from, to),
      nacellePosition: columns.nacelle_position.subarray(from, to),
      day: new Int32Array(DAY_S).fill(day),
      usable: state.slice(from, to).map((code) => (STATES[code] === 'run' ? 1 : 0)),
    })
  }
  return windows
}

/** The curve as the frame would measure it, from 10-minute means of the turbine's own anemometer. */
function curveOf({ columns, state }: SimulatedTurbine): MeasuredCurve {
  const speeds: number[] = []
  const powers: number[] = []
  for (let from = 0; from + INTERVAL_S <= state.length; from += INTERVAL_S) {
    let speed = 0
    let power = 0
    let runs = true
    for (let i = from; i < from + INTERVAL_S; i++) {
      speed += columns.wind_speed[i]!
      power += columns.power[i]!
      runs &&= STATES[state[i]!] === 'run'
    }
    if (!runs) continue
    speeds.push(speed / INTERVAL_S)
    powers.push(power / INTERVAL_S)
  }
  return measuredPowerCurve(speeds, powers)
}
