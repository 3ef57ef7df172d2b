import { resolutionOf, yawMoves } from '../../kernel/motion/index.ts'
import { DAY_MS, type HighRateRows } from '../high-rate/high-rate-rows.ts'

/** Rows further apart than this show no moves, s. */
const SLOWEST_S = 10
/** The vane is averaged over so long before a move, and just after it, s. */
const BEFORE_S = 60
const AFTER_S = 10
/** ... and over so long when the delay is told; looked back at most so far. */
const RUNNING_S = 30
const LOOK_BACK_S = 900
/** A step between rows faster than this is no movement: degrees per second, and degrees that a coarse reading may step. */
const FASTEST_DEG_S = 1.5
const COARSE_DEG = 10

/** Moves that begin on a day; every array has one entry per move. */
export interface YawDay {
  readonly startMs: Float64Array
  readonly durationS: Float64Array
  /** Positive: the reading rises. */
  readonly travelDeg: Float64Array
  /** Mean vane of the minute before and of ten seconds after, degrees; NaN where it is missing. */
  readonly vaneBeforeDeg: Float64Array
  readonly vaneAfterDeg: Float64Array
  /** Since the running mean of the vane was past half its value at the start, s; NaN where that is not seen. */
  readonly delayS: Float64Array
  /** Time with readings of the position, s. */
  readonly coveredS: number
  /** Lowest and highest position of the unwrapped path of the day, degrees; NaN without one. */
  readonly lowestDeg: number
  readonly highestDeg: number
  /** Step of the reading, degrees; 0 = it never changed. */
  readonly stepDeg: number
  /** Steps between rows that no drive makes, and the largest of them, degrees. */
  readonly jumps: number
  readonly largestJumpDeg: number
}

/** What the yaw drive did on one day; null where rows are too far apart or hold no position. */
export function yawDay(rows: HighRateRows): YawDay | null {
  const { timeMs, nacellePosition, vane, sampleS } = rows
  if (!(sampleS <= SLOWEST_S)) return null
  const origin = timeMs[0]!
  const timeS = timeMs.map((ms) => (ms - origin) / 1000)
  const { stepDeg } = resolutionOf(timeS, nacellePosition)
  let known = 0
  let lowestDeg = NaN
  let highestDeg = NaN
  let jumps = 0
  let largestJumpDeg = 0
  let last = -1
  let path = NaN
  for (let i = rows.first; i < rows.end; i++) {
    const reading = nacellePosition[i]!
    if (Number.isNaN(reading)) continue
    known++
    const raw = last < 0 ? 0 : reading - nacellePosition[last]!
    const step = raw - 360 * Math.round(raw / 360)
    if (last >= 0 && Math.abs(step) > FASTEST_DEG_S * (timeS[i]! - timeS[last]!) + COARSE_DEG) {
      jumps++
      largestJumpDeg = Math.max(largestJumpDeg, Math.abs(step))
    }
    path = last < 0 ? reading : path + step
    lowestDeg = path < lowestDeg || last < 0 ? path : lowestDeg
    highestDeg = path > highestDeg || last < 0 ? path : highestDeg
    last = i
  }
  if (known === 0) return null
  const moves = yawMoves(timeS, nacellePosition)
  const mine: number[] = []
  moves.start.forEach((at, k) => {
    if (timeMs[at]! >= rows.dayMs && timeMs[at]! < rows.dayMs + DAY_MS) mine.push(k)
  })
  const each = (valueOf: (start: number, stop: number, k: number) => number): Float64Array =>
    Float64Array.from(mine, (k) => valueOf(moves.start[k]!, moves.stop[k]!, k))
  return {
    startMs: each((start) => timeMs[start]!),
    durationS: each((start, stop) => timeS[stop]! - timeS[start]!),
    travelDeg: each((_start, _stop, k) => moves.travelDeg[k]!),
    vaneBeforeDeg: each((start) => meanBetween(timeS, vane, timeS[start]! - BEFORE_S, timeS[start]!, start)),
    vaneAfterDeg: each((_start, stop) =>
      meanBetween(timeS, vane, timeS[stop]!, timeS[stop]! + AFTER_S, stop),
    ),
    delayS: each((start) => delayBefore(timeS, vane, start)),
    coveredS: known * sampleS,
    lowestDeg,
    highestDeg,
    stepDeg,
    jumps,
    largestJumpDeg,
  }
}

/** Mean of the vane over [fromS, toS], looked for around row `near`; NaN without half of the rows. */
function meanBetween(
  timeS: Float64Array,
  vane: Float64Array,
  fromS: number,
  toS: number,
  near: number,
): number {
  let at = near
  while (at > 0 && timeS[at - 1]! >= fromS) at--
  let sum = 0
  let count = 0
  let rows = 0
  for (; at < timeS.length && timeS[at]! <= toS; at++) {
    if (timeS[at]! < fromS) continue
    rows++
    if (Number.isNaN(vane[at]!)) continue
    sum += vane[at]!
    count++
  }
  return count >= Math.max(1, rows / 2) ? sum / count : NaN
}

function delayBefore(timeS: Float64Array, vane: Float64Array, start: number): number {
  const meanAt = (i: number): number => meanBetween(timeS, vane, timeS[i]! - RUNNING_S, timeS[i]!, i)
  const atStart = meanAt(start)
  if (!(Math.abs(atStart) > 0)) return NaN
  for (let i = start; i >= 0 && timeS[start]! - timeS[i]! <= LOOK_BACK_S; i -= 5) {
    if (meanAt(i) * Math.sign(atStart) < Math.abs(atStart) / 2) return timeS[start]! - timeS[i]!
  }
  return NaN
}
