import { wrap180, wrap360 } from '../../kernel/angle/index.ts'
import { medianOf } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { YawActivity } from '../../sheet/index.ts'
import type { YawDay } from './yaw-day.ts'

/** A change of the position between rows of means that is a move, degrees. */
const MOVE_DEG = 1.5
/** Rate is told from moves of so much travel, degrees. */
const RATED_TRAVEL_DEG = 3
const SLOW_SHARE = 0.6
/** A move so long unwinds the cable. */
const UNTWIST_DEG = 300
/** A move the other way begins within so long after the last one: hunting, s. */
const HUNTING_S = 180
const DAYS_PER_MONTH = 30.44
const SECTOR_DEG = 30
const SPEEDS_MS: readonly [number, number] = [3, 25]
const FEW_ROWS = 30

/** Moves of a turbine in order of time, as {@link YawDay} has them. */
interface Moves {
  readonly startMs: readonly number[]
  readonly durationS: readonly number[]
  readonly travelDeg: readonly number[]
  readonly vaneBeforeDeg: readonly number[]
  readonly vaneAfterDeg: readonly number[]
  readonly delayS: readonly number[]
}

/**
 * What the yaw drive and its controller did: from high-rate rows where there are some, else lower bounds from rows of means.
 *
 * @param days  of the high-rate rows, in order; empty = none.
 */
export function yawActivity(turbine: TurbineFrame, days: readonly YawDay[]): YawActivity {
  const known = turbine.nacellePosition.reduce((sum, value) => sum + (Number.isNaN(value) ? 0 : 1), 0)
  const fast = days.length > 0
  const moves = fast ? joined(days) : movesOfRows(turbine)
  const coveredDays = fast
    ? days.reduce((sum, { coveredS }) => sum + coveredS, 0) / 86_400
    : (known * turbine.intervalS) / 86_400
  const turned = moves.travelDeg.reduce((sum, travel) => sum + Math.abs(travel), 0)
  const perDay = (value: number): number | null => (coveredDays > 0 ? value / coveredDays : null)
  const yawing = moves.durationS.reduce((sum, duration) => sum + duration, 0)
  const rate = (sign: -1 | 0 | 1): number[] =>
    moves.travelDeg.flatMap((travel, k) =>
      fast && Math.abs(travel) >= RATED_TRAVEL_DEG && (sign === 0 || Math.sign(travel) === sign)
        ? [Math.abs(travel) / moves.durationS[k]!]
        : [],
    )
  const usual = medianOrNull(rate(0))
  const ordinary = moves.travelDeg.map((travel) => Math.abs(travel) < UNTWIST_DEG)
  const towards = (vane: readonly number[]): number[] =>
    vane.map((value, k) => value * Math.sign(moves.travelDeg[k]!)).filter((_, k) => ordinary[k])
  const threshold = fast ? medianOrNull(towards(moves.vaneBeforeDeg)) : null
  const count = moves.travelDeg.length
  return {
    source: known === 0 ? 'none' : fast ? 'high-rate' : 'intervals',
    lowerBounds: !fast,
    daysCovered: known === 0 ? null : coveredDays,
    moves: count,
    movesPerDay: perDay(count),
    movesPerMonth: perDay(count * DAYS_PER_MONTH),
    travelDegPerDay: perDay(turned),
    travelDegPerMonth: perDay(turned * DAYS_PER_MONTH),
    shareOfTimeYawing: fast ? perDay(yawing / 86_400) : null,
    medianDurationS: fast ? medianOrNull(moves.durationS) : null,
    medianTravelDeg: medianOrNull(moves.travelDeg.map(Math.abs)),
    medianRateDegS: usual,
    slowMovesShare: usual === null ? null : share(rate(0), (value) => value < SLOW_SHARE * usual),
    clockwiseMovesShare: share(moves.travelDeg, (travel) => travel > 0),
    clockwiseRateDegS: medianOrNull(rate(1)),
    counterClockwiseRateDegS: medianOrNull(rate(-1)),
    startThresholdDeg: threshold,
    stopPointDeg: fast ? medianOrNull(towards(moves.vaneAfterDeg)) : null,
    delayS: fast ? medianOrNull(moves.delayS) : null,
    huntingShare: fast && count > 1 ? turnedBack(moves) / count : null,
    byWindSpeed: bySpeed(turbine, threshold),
    bySector: bySector(turbine),
    cableTwist: {
      rangeTurns: rangeTurns(turbine, days),
      untwistRuns: ordinary.filter((one) => !one).length,
      limitTurns: turbine.setup.nacelle?.twistLimitTurns ?? null,
    },
    note: fast
      ? 'from rows of seconds'
      : known === 0
        ? 'no nacelle position in the log'
        : 'from rows of means: moves back and forth within a row are not seen, so moves and travel are lower bounds; rate, thresholds and hunting need rows of seconds',
  }
}

function joined(days: readonly YawDay[]): Moves {
  const all = (pick: (day: YawDay) => Float64Array): number[] => days.flatMap((day) => [...pick(day)])
  return {
    startMs: all((day) => day.startMs),
    durationS: all((day) => day.durationS),
    travelDeg: all((day) => day.travelDeg),
    vaneBeforeDeg: all((day) => day.vaneBeforeDeg),
    vaneAfterDeg: all((day) => day.vaneAfterDeg),
    delayS: all((day) => day.delayS),
  }
}

/** Changes of the position from row to row; durations are not known. */
function movesOfRows({ time, nacellePosition, intervalS }: TurbineFrame): Moves {
  const startMs: number[] = []
  const travelDeg: number[] = []
  for (let i = 1; i < time.length; i++) {
    const step = wrap180(nacellePosition[i]! - nacellePosition[i - 1]!)
    if (!(Math.abs(step) > MOVE_DEG) || time[i]! - time[i - 1]! > 1500 * intervalS) continue
    startMs.push(time[i - 1]!)
    travelDeg.push(step)
  }
  return { startMs, travelDeg, durationS: [], vaneBeforeDeg: [], vaneAfterDeg: [], delayS: [] }
}

function turnedBack({ startMs, durationS, travelDeg }: Moves): number {
  let count = 0
  for (let k = 1; k < startMs.length; k++) {
    const rested = (startMs[k]! - startMs[k - 1]!) / 1000 - durationS[k - 1]!
    if (travelDeg[k]! * travelDeg[k - 1]! < 0 && rested <= HUNTING_S) count++
  }
  return count
}

function bySpeed(turbine: TurbineFrame, threshold: number | null): YawActivity['byWindSpeed'] {
  const bins: YawActivity['byWindSpeed'] = []
  for (let from = SPEEDS_MS[0]; from < SPEEDS_MS[1]; from++) {
    const vanes = vanesWhere(
      turbine,
      (i) => turbine.windSpeed[i]! >= from && turbine.windSpeed[i]! < from + 1,
    )
    if (vanes.length === 0) continue
    const mean = meanOf(vanes)
    const squares = vanes.reduce((sum, vane) => sum + (vane - mean) ** 2, 0)
    bins.push({
      windFromMs: from,
      windToMs: from + 1,
      rows: vanes.length,
      vaneMeanDeg: mean,
      vaneSdDeg: vanes.length > 1 ? Math.sqrt(squares / (vanes.length - 1)) : null,
      impliedSdDeg: threshold === null ? null : Math.abs(threshold) / Math.sqrt(3),
    })
  }
  return bins
}

function bySector(turbine: TurbineFrame): YawActivity['bySector'] {
  return Array.from({ length: 360 / SECTOR_DEG }, (_, s) => {
    const vanes = vanesWhere(
      turbine,
      (i) => Math.floor(wrap360(turbine.indicatedDirection[i]!) / SECTOR_DEG) === s,
    )
    return {
      fromDeg: s * SECTOR_DEG,
      toDeg: (s + 1) * SECTOR_DEG,
      rows: vanes.length,
      vaneMeanDeg: vanes.length >= FEW_ROWS ? meanOf(vanes) : null,
    }
  })
}

function vanesWhere(turbine: TurbineFrame, wanted: (i: number) => boolean): number[] {
  const vanes: number[] = []
  for (let i = 0; i < turbine.time.length; i++) {
    if (turbine.running[i] === 1 && wanted(i) && !Number.isNaN(turbine.vane[i]!)) vanes.push(turbine.vane[i]!)
  }
  return vanes
}

/** Wound positions by themselves; a scale of one turn only where the path of every day is known, day by day. */
function rangeTurns(turbine: TurbineFrame, days: readonly YawDay[]): number | null {
  let low = Infinity
  let high = -Infinity
  for (const position of turbine.nacellePosition) {
    if (position < low) low = position
    if (position > high) high = position
  }
  if (high - low > 400) return (high - low) / 360
  const range = Math.max(...days.map(({ lowestDeg, highestDeg }) => highestDeg - lowestDeg))
  return days.length > 0 && range >= 0 ? range / 360 : null
}

function meanOf(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length
}

function medianOrNull(values: readonly number[]): number | null {
  const median = medianOf(values.filter((value) => Number.isFinite(value)))
  return Number.isNaN(median) ? null : median
}

function share(values: readonly number[], wanted: (value: number) => boolean): number | null {
  return values.length === 0 ? null : values.filter(wanted).length / values.length
}
