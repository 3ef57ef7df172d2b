import { InputError } from '../../errors.ts'
import { resolutionOf } from './resolution.ts'

/** At rest the reading may leave its level by so many steps, or standard deviations of its noise, without having moved. */
const BAND_STEPS = 1.5
const BAND_SDS = 5
const LEAST_BAND_DEG = 0.3
/** Within so many steps or standard deviations of the level a reading still counts as at rest when a start is traced back. */
const REST_STEPS = 0.6
const REST_SDS = 2
/** Readings this much further from it still belong to the level before or after a move: less than one step. */
const SETTLED_RESTS = 1.5
/** The level at rest follows the reading with this time constant, so that a drifting sensor does not move, s. */
const LEVEL_S = 60
/** A nacelle that makes no headway for so long has stopped, s; at least three samples. */
const PAUSE_S = 8
const PAUSE_SAMPLES = 3
/** A gap in the readings of more than this ends what is going on, s; at least three samples. */
const GAP_S = 15

export interface YawMoveOptions {
  /** Moves of less travel are left out, degrees, > 0. Default 1. */
  leastTravelDeg?: number
  /** Slower changes are drift, not yaw, degrees per second. Default 0.05. */
  leastRateDegS?: number
}

/** Moves of a nacelle in order of time; every array has one entry per move. */
export interface YawMoves {
  /** Index of the last sample at rest before the move. */
  readonly start: Int32Array
  /** Index of the first sample at rest after it. */
  readonly stop: Int32Array
  /** Degrees, signed as the reading: positive = the reading rises. */
  readonly travelDeg: Float64Array
  /** |travel| over the time from start to stop, degrees per second. */
  readonly rateDegS: Float64Array
  /** Step of the reading and its noise (SD) at rest, degrees, as found. */
  readonly stepDeg: number
  readonly noiseDeg: number
}

/**
 * Yaw moves of one turbine from its nacelle position at a high rate.
 *
 * The reading has moved when it leaves a band about its level at rest, wide enough for its resolution and noise (both taken
 * from the readings); the start is traced back to where it left the level, the stop is where headway ends. Start and stop
 * are right to about the time that one step of the reading takes, travel to one step. A move is left out where a gap of more
 * than 15 s lies inside it or less than 8 s before it.
 *
 * @param timeS       s, rising, regular at 0.1 to 20 Hz but for gaps; length n.
 * @param positionDeg degrees on any scale: wrapped, signed or wound; length n; NaN = missing.
 * @throws InputError LENGTH_MISMATCH, OUT_OF_RANGE
 */
export function yawMoves(
  timeS: Float64Array,
  positionDeg: Float64Array,
  { leastTravelDeg = 1, leastRateDegS = 0.05 }: YawMoveOptions = {},
): YawMoves {
  const n = timeS.length
  if (positionDeg.length !== n) {
    throw new InputError('LENGTH_MISMATCH', `positionDeg: expected ${n} values, got ${positionDeg.length}`)
  }
  if (!(leastTravelDeg > 0)) {
    throw new InputError('OUT_OF_RANGE', `leastTravelDeg: expected > 0, got ${leastTravelDeg}`)
  }
  const { stepDeg, noiseDeg, sampleS } = resolutionOf(timeS, positionDeg)
  const bandDeg = Math.max(LEAST_BAND_DEG, BAND_STEPS * stepDeg, BAND_SDS * noiseDeg)
  const restDeg = Math.max(REST_STEPS * stepDeg, REST_SDS * noiseDeg, 1e-6)
  const pauseS = Math.max(PAUSE_S, PAUSE_SAMPLES * sampleS)
  const gapS = Math.max(GAP_S, PAUSE_SAMPLES * sampleS)
  const follow = Math.min(1, sampleS / LEVEL_S)
  const start: number[] = []
  const stop: number[] = []
  const travel: number[] = []
  const rate: number[] = []

  // The reading without its seams; level: where it rests; sign: of the move under way, 0 = at rest.
  const path = new Float64Array(n)
  let last = -1
  let begun = 0
  let level = NaN
  let sign = 0
  let from = 0
  let furthest = 0
  let furthestAt = 0
  const finish = (): void => {
    const moved = settledAt(path, furthestAt, last, furthest, restDeg) - level
    const lastedS = timeS[furthestAt]! - timeS[from]!
    const speed = Math.abs(moved) / lastedS
    const restSeen = timeS[from]! - timeS[begun]! >= pauseS
    if (restSeen && moved * sign >= leastTravelDeg && speed >= leastRateDegS) {
      start.push(from)
      stop.push(furthestAt)
      travel.push(moved)
      rate.push(speed)
    }
    level += moved
    sign = 0
  }
  for (let i = 0; i < n; i++) {
    const reading = positionDeg[i]!
    if (!(reading - reading === 0)) continue
    if (last < 0 || timeS[i]! - timeS[last]! > gapS) {
      // What was under way before the gap has no known end, and what goes on after it no known start.
      begun = i
      path[i] = reading
      level = reading
      sign = 0
      last = i
      continue
    }
    const delta = reading - positionDeg[last]!
    path[i] = path[last]! + delta - 360 * Math.round(delta / 360)
    const before = last
    last = i
    const away = path[i]! - level
    if (sign === 0) {
      if (Math.abs(away) <= bandDeg) {
        level += follow * away
        continue
      }
      sign = away > 0 ? 1 : -1
      from = tracedBack(path, positionDeg, timeS, before, { level, sign, restDeg, gapS })
      level = levelBefore(path, positionDeg, from, level, restDeg)
      furthest = path[i]!
      furthestAt = i
    } else if ((path[i]! - furthest) * sign > restDeg) {
      furthest = path[i]!
      furthestAt = i
    } else if (timeS[i]! - timeS[furthestAt]! >= pauseS || (furthest - path[i]!) * sign > bandDeg) {
      finish()
    }
  }
  return {
    start: Int32Array.from(start),
    stop: Int32Array.from(stop),
    travelDeg: Float64Array.from(travel),
    rateDegS: Float64Array.from(rate),
    stepDeg,
    noiseDeg,
  }
}

/** The last sample that still lay at the level, walking back from `at`. */
function tracedBack(
  path: Float64Array,
  reading: Float64Array,
  timeS: Float64Array,
  at: number,
  { level, sign, restDeg, gapS }: { level: number; sign: number; restDeg: number; gapS: number },
): number {
  let from = at
  for (let j = at; j >= 0; j--) {
    if (!(reading[j]! - reading[j]! === 0)) continue
    if (timeS[from]! - timeS[j]! > gapS) break
    from = j
    if ((path[j]! - level) * sign <= restDeg) break
  }
  return from
}

/** Mean of the readings at rest just before a move: nearer than the level that follows slowly. */
function levelBefore(
  path: Float64Array,
  reading: Float64Array,
  from: number,
  level: number,
  restDeg: number,
): number {
  let sum = 0
  let count = 0
  for (let j = from; j >= 0 && j > from - 5; j--) {
    if (!(reading[j]! - reading[j]! === 0) || Math.abs(path[j]! - path[from]!) > SETTLED_RESTS * restDeg)
      break
    sum += path[j]!
    count++
  }
  return count > 0 ? sum / count : level
}

/** Mean of the readings from the stop on that stay near it. */
function settledAt(path: Float64Array, from: number, to: number, furthest: number, restDeg: number): number {
  let sum = 0
  let count = 0
  for (let j = from; j <= to; j++) {
    // Samples without a reading have no path; they are 0 and far off, or harmless.
    if (Math.abs(path[j]! - furthest) > SETTLED_RESTS * restDeg) continue
    sum += path[j]!
    count++
  }
  return count > 0 ? sum / count : furthest
}
