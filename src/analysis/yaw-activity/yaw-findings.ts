import { studentQuantile } from '../../kernel/stats/index.ts'
import { wrap360 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding, SensorTest, YawActivity } from '../../sheet/index.ts'
import type { YawDay } from './yaw-day.ts'

// Limits are common practice, no source: far outside what healthy controllers show.
const SLOWEST_DEG_S = 0.15
const SLOW_MOVES_SHARE = 0.2
const HUNTING_SHARE = 0.25
const OVERSHOT_DEG = -4
const RATES_APART = 1.3
const WIDEST_THRESHOLD_DEG = 15
const UNTWISTS_PER_DAY = 1
/** Fewer moves, or days, than this decide nothing. */
const FEW_MOVES = 60
const FEW_DAYS = 5
/** A sector whose mean vane stands so far from that of the others is turned on purpose, degrees. */
const DELIBERATE_DEG = 4
const SECTOR_DEG = 30
/** Rows of a sector on a day without which the day says nothing of it. */
const SECTOR_ROWS = 6
const CHANCE = 1e-5

/** What is odd about the yaw drive, its controller or the cable. */
export function yawFindings(
  turbine: TurbineFrame,
  yaw: YawActivity,
  days: readonly YawDay[] = [],
): SensorFinding[] {
  const found: Found[] = []
  const enough = yaw.source === 'high-rate' && yaw.moves >= FEW_MOVES
  const { medianRateDegS: rate, slowMovesShare, huntingShare, stopPointDeg, startThresholdDeg } = yaw
  if (enough && rate !== null && (rate < SLOWEST_DEG_S || (slowMovesShare ?? 0) > SLOW_MOVES_SHARE)) {
    found.push({
      sensor: 'yaw-drive',
      kind: 'slow-yaw',
      finding: `the nacelle turns at ${rate.toFixed(2)} degrees a second as a median, and ${(100 * (slowMovesShare ?? 0)).toFixed(0)} % of the moves are much slower than that`,
      checkFirst:
        'At the desk: motor currents and brake pressure over yaw moves, of all drives. Then grease and brakes at the yaw ring.',
      detail: { medianRateDegS: rate, slowMovesShare },
    })
  }
  if (enough && huntingShare !== null && huntingShare > HUNTING_SHARE) {
    found.push({
      sensor: 'controller',
      kind: 'hunting',
      finding: `${(100 * huntingShare).toFixed(0)} % of the moves are turned back within three minutes`,
      checkFirst:
        'At the desk: threshold, averaging time and stop point of the yaw controller against those of its neighbours.',
      detail: { huntingShare, moves: yaw.moves },
    })
  }
  if (enough && stopPointDeg !== null && stopPointDeg < OVERSHOT_DEG) {
    found.push({
      sensor: 'yaw-drive',
      kind: 'overshoot',
      finding: `moves end ${(-stopPointDeg).toFixed(1)} degrees past the wind as a median`,
      checkFirst: 'At the desk: stop point and brake delay of the yaw controller. Then the brakes.',
      detail: { stopPointDeg },
    })
  }
  const up = yaw.clockwiseRateDegS
  const down = yaw.counterClockwiseRateDegS
  if (enough && up !== null && down !== null && Math.max(up / down, down / up) > RATES_APART) {
    found.push({
      sensor: 'yaw-drive',
      kind: 'unbalanced-moves',
      finding: `the nacelle turns at ${up.toFixed(2)} degrees a second one way and at ${down.toFixed(2)} the other`,
      checkFirst: 'At the desk: motor currents by direction, and which drives run. Then the contactors.',
      detail: { clockwiseRateDegS: up, counterClockwiseRateDegS: down },
    })
  }
  if (enough && startThresholdDeg !== null && startThresholdDeg > WIDEST_THRESHOLD_DEG) {
    found.push({
      sensor: 'controller',
      kind: 'wide-threshold',
      finding: `moves begin only at ${startThresholdDeg.toFixed(0)} degrees of yaw error by the vane`,
      checkFirst: 'At the desk: threshold and averaging time of the yaw controller.',
      detail: { startThresholdDeg },
    })
  }
  const { rangeTurns, untwistRuns, limitTurns } = yaw.cableTwist
  const tooFar = rangeTurns !== null && limitTurns !== null && rangeTurns > 2 * limitTurns + 0.5
  const tooOften = (yaw.daysCovered ?? 0) >= FEW_DAYS && untwistRuns > UNTWISTS_PER_DAY * yaw.daysCovered!
  if (tooFar || tooOften) {
    found.push({
      sensor: 'yaw-drive',
      kind: 'cable-twist',
      finding: tooFar
        ? `the position ran over ${rangeTurns.toFixed(1)} turns, more than ${limitTurns} to either side`
        : `the cable was unwound ${untwistRuns} times in ${yaw.daysCovered!.toFixed(0)} days`,
      checkFirst: 'At the desk: counter and limit of the cable twist. Then the limit switch, and the cable.',
      detail: { rangeTurns, untwistRuns, limitTurns },
    })
  }
  const jumps = days.reduce((sum, day) => sum + day.jumps, 0)
  if (jumps > 0) {
    const largestDeg = Math.max(...days.map((day) => day.largestJumpDeg))
    found.push({
      sensor: 'nacelle-position',
      kind: 'impossible-jump',
      finding: `the position jumped ${jumps} times from one reading to the next faster than any yaw drive turns, by ${largestDeg.toFixed(0)} degrees at most`,
      checkFirst:
        'At the desk: the rows around these moments, restarts of controller or logger. Then cable and plug of the sensor.',
      detail: { jumps, largestDeg },
    })
  }
  found.push(...deliberate(turbine))
  const { time, intervalS } = turbine
  return found.map((one) => ({
    ...one,
    severity: one.kind === 'deliberate-yaw' ? 'info' : 'warn',
    howSure: 'likely',
    from: new Date(time[0]!).toISOString(),
    to: new Date(time.at(-1)! + intervalS * 1000).toISOString(),
  }))
}

type Found = Pick<SensorFinding, 'sensor' | 'kind' | 'finding' | 'checkFirst' | 'detail'>

/** Sectors in which the mean vane stands off on day after day: a controller that yaws on purpose does not null it there. */
function deliberate(turbine: TurbineFrame): Found[] {
  const byDay = new Map<string, { sum: number; rows: number }>()
  let all = 0
  let rows = 0
  for (let i = 0; i < turbine.time.length; i++) {
    const sector = Math.floor(wrap360(turbine.indicatedDirection[i]!) / SECTOR_DEG)
    const vane = turbine.vane[i]!
    if (turbine.running[i] !== 1 || Number.isNaN(sector + vane)) continue
    const key = `${sector} ${turbine.day[i]!}`
    const cell = byDay.get(key) ?? { sum: 0, rows: 0 }
    byDay.set(key, { sum: cell.sum + vane, rows: cell.rows + 1 })
    all += vane
    rows++
  }
  const found: Found[] = []
  for (let sector = 0; sector < 360 / SECTOR_DEG; sector++) {
    const means = [...byDay]
      .filter(([key, cell]) => key.startsWith(`${sector} `) && cell.rows >= SECTOR_ROWS)
      .map(([, { sum, rows: n }]) => sum / n - all / rows)
    if (means.length < FEW_DAYS) continue
    const mean = means.reduce((sum, value) => sum + value, 0) / means.length
    const sd = Math.sqrt(means.reduce((sum, value) => sum + (value - mean) ** 2, 0) / (means.length - 1))
    const sure =
      Math.abs(mean) > (studentQuantile(1 - CHANCE, means.length - 1) * sd) / Math.sqrt(means.length)
    if (!(Math.abs(mean) >= DELIBERATE_DEG && sure)) continue
    const [from, to] = [sector * SECTOR_DEG, (sector + 1) * SECTOR_DEG]
    found.push({
      sensor: 'controller',
      kind: 'deliberate-yaw',
      finding: `with wind from ${from} to ${to} degrees, by nacelle plus vane as read, the mean vane stands ${mean.toFixed(1)} degrees from that of all directions, on day after day: sector management or wake steering`,
      checkFirst: 'At the desk: tables of sector management or wake steering in the controller.',
      detail: { fromDeg: from, toDeg: to, meanDeg: mean, days: means.length },
    })
  }
  return found
}

/** Tests of yaw drive and controller that the log allowed. */
export function yawTests(yaw: YawActivity): SensorTest[] {
  const fast = yaw.source === 'high-rate'
  const note = fast ? `on ${yaw.moves} moves` : 'rows of seconds with nacelle position are needed'
  return [
    { sensor: 'yaw-drive', test: 'slow yaw, overshoot, balance', done: fast && yaw.moves >= FEW_MOVES, note },
    { sensor: 'controller', test: 'hunting, start threshold', done: fast && yaw.moves >= FEW_MOVES, note },
    {
      sensor: 'controller',
      test: 'deliberate yaw by sector',
      done: yaw.bySector.some(({ vaneMeanDeg }) => vaneMeanDeg !== null),
      note: 'mean vane by direction sector, day by day',
    },
  ]
}
