import { InputError } from '../../errors.ts'
import { yawMoves } from '../../kernel/motion/index.ts'

/** Length of the windows of power before and after, s. */
const WINDOW_S = 60
/** After a stop the rotor needs so long to answer to its new yaw error, s. */
const SETTLE_S = 20
/** Windows of the wind's direction before the start, as seconds before it: from, to. The first is that of the power. */
const PATH_BEFORE_S = [
  [60, 0],
  [20, 0],
  [120, 60],
  [180, 120],
  [300, 180],
  [600, 300],
] as const
/** ... and after the stop, as seconds after it. */
const PATH_AFTER_S = [
  [0, 20],
  [20, 80],
  [80, 140],
] as const
/** Directions of a row, each relative to the minute before the start. */
export const PATH_LENGTH = PATH_BEFORE_S.length - 1 + PATH_AFTER_S.length
const BEFORE_S = PATH_BEFORE_S[PATH_BEFORE_S.length - 1]![0]
const AFTER_S = PATH_AFTER_S[PATH_AFTER_S.length - 1]![1]
/** Share of a window's samples that must be there. */
const COVERED = 0.8
/** Rests are taken at whole multiples of this time, s. */
const REST_EVERY_S = 120
/** A rest is given the length of the last move before it; of this before the first, s. */
const FIRST_LENGTH_S = 25
/** Moves that take longer are turns out of a twisted cable, or two in one, s. */
const LONGEST_S = 120
/** Beyond this the vane is no measure of the yaw error, degrees. */
const VANE_MAX_DEG = 45
/** What is kept of a chunk, so that moves near its end meet their minutes after, s. */
const TAIL_S = BEFORE_S + AFTER_S + 4 * LONGEST_S

/** Samples of one turbine at 0.1 to 20 Hz, rising in time; all of length n; NaN = missing. */
export interface HighRateChunk {
  /** Epoch ms. */
  readonly timeMs: Float64Array
  /** Degrees, sign as DESIGN, 0 ahead. */
  readonly vane: Float64Array
  /** kW. */
  readonly power: Float64Array
  /** Degrees on any scale, rising clockwise. */
  readonly nacellePosition: Float64Array
  /** Index of the calendar day. */
  readonly day: Int32Array
  /** 1 = the turbine runs and nothing holds its power below what the wind offers; absent: it always does. */
  readonly usable?: Uint8Array
}

/** One row per yaw move, and one per rest: a moment without a move, treated as if there had been one of no travel. */
export interface YawMoveRows {
  /** Start of the move, epoch ms. */
  readonly startMs: readonly number[]
  readonly day: readonly number[]
  /** Degrees, positive = clockwise; 0 = a rest. */
  readonly travelDeg: readonly number[]
  /** Mean of ln P over both windows, and what it gains from before to after; kW. */
  readonly logPower: readonly number[]
  readonly logPowerGain: readonly number[]
  /** Mean vane of the two windows, degrees. */
  readonly vaneBeforeDeg: readonly number[]
  readonly vaneAfterDeg: readonly number[]
  /** Direction N + v in windows around, relative to the minute before, degrees; PATH_LENGTH a row. */
  readonly pathDeg: readonly number[]
}

/**
 * Gathers the minutes around yaw moves, and around rests, from a log that comes in chunks. What is kept grows with moves
 * and days (720 rests a day at most), not with samples; how the log is cut into chunks does not change it as long as a
 * chunk holds 20 minutes or more.
 */
export class YawMoveWindows {
  readonly #rows = {
    startMs: [] as number[],
    day: [] as number[],
    travelDeg: [] as number[],
    logPower: [] as number[],
    logPowerGain: [] as number[],
    vaneBeforeDeg: [] as number[],
    vaneAfterDeg: [] as number[],
    pathDeg: [] as number[],
  }
  #tail: Required<HighRateChunk> | null = null
  /** Starts up to here have been seen to, epoch s. */
  #doneS = -Infinity
  #lengthS = FIRST_LENGTH_S

  get rows(): YawMoveRows {
    return this.#rows
  }

  /** Rows of moves and rests that begin from one moment to before another, epoch ms. */
  rowsBetween(fromMs: number, toMs: number): YawMoveRows {
    return yawMoveRowsWhere(this.#rows, (i) => {
      const startMs = this.#rows.startMs[i]!
      return startMs >= fromMs && startMs < toMs
    })
  }

  /** @throws InputError LENGTH_MISMATCH; OUT_OF_RANGE when a chunk begins before the end of the one before. */
  add(chunk: HighRateChunk): void {
    const given = checked(chunk)
    const log = this.#tail ? joined(this.#tail, given) : given
    const n = log.timeMs.length
    if (n < 2) return
    const timeS = log.timeMs.map((ms) => ms / 1000)
    const moves = yawMoves(timeS, log.nacellePosition)
    const sums = new WindowSums(timeS, log)
    const endS = timeS[n - 1]! - AFTER_S
    let next = 0
    let restS = Math.ceil(Math.max(timeS[0]! + BEFORE_S, this.#doneS + 1) / REST_EVERY_S) * REST_EVERY_S
    let doneS = this.#doneS
    // Moves and rests in order of time: a rest is as long as the last move before it.
    for (;;) {
      const startS = next < moves.start.length ? timeS[moves.start[next]!]! : Infinity
      if (startS <= restS) {
        const stopS = timeS[moves.stop[next]!]!
        if (stopS > endS) break
        const clear =
          (next === 0 || timeS[moves.stop[next - 1]!]! <= startS - WINDOW_S) &&
          (next + 1 >= moves.start.length || timeS[moves.start[next + 1]!]! >= stopS + SETTLE_S + WINDOW_S)
        if (startS > this.#doneS) {
          if (stopS - startS <= LONGEST_S) {
            this.#lengthS = stopS - startS
            if (clear) this.#take(sums, log, startS, stopS, moves.travelDeg[next]!)
          }
          doneS = startS
        }
        next++
      } else {
        const stopS = restS + this.#lengthS
        if (stopS > endS) break
        const moved =
          (next < moves.start.length && startS < stopS + SETTLE_S + WINDOW_S) ||
          (next > 0 && timeS[moves.stop[next - 1]!]! > restS - WINDOW_S)
        if (!moved) this.#take(sums, log, restS, stopS, 0)
        doneS = Math.max(doneS, restS)
        restS += REST_EVERY_S
      }
    }
    this.#doneS = doneS
    this.#tail = tailOf(log, timeS)
  }

  #take(
    sums: WindowSums,
    log: Required<HighRateChunk>,
    startS: number,
    stopS: number,
    travelDeg: number,
  ): void {
    const before = sums.power(startS - WINDOW_S, startS)
    const after = sums.power(stopS + SETTLE_S, stopS + SETTLE_S + WINDOW_S)
    if (Number.isNaN(before) || Number.isNaN(after)) return
    const reference = sums.direction(startS - WINDOW_S, startS)
    const path = [
      ...PATH_BEFORE_S.slice(1).map(([from, to]) => sums.direction(startS - from, startS - to)),
      ...PATH_AFTER_S.map(([from, to]) => sums.direction(stopS + from, stopS + to)),
    ]
    if (path.some((angle) => Number.isNaN(angle))) return
    const rows = this.#rows
    rows.startMs.push(startS * 1000)
    rows.day.push(log.day[sums.indexOf(startS)]!)
    rows.travelDeg.push(travelDeg)
    rows.logPower.push((before + after) / 2)
    rows.logPowerGain.push(after - before)
    rows.vaneBeforeDeg.push(sums.vane(startS - WINDOW_S, startS))
    rows.vaneAfterDeg.push(sums.vane(stopS + SETTLE_S, stopS + SETTLE_S + WINDOW_S))
    for (const angle of path) rows.pathDeg.push(angle - reference)
  }
}

/** The rows that are chosen, in their order. */
export function yawMoveRowsWhere(rows: YawMoveRows, chosen: (row: number) => boolean): YawMoveRows {
  const index = rows.startMs.map((_, i) => i).filter(chosen)
  const of = (values: readonly number[]): number[] => index.map((i) => values[i]!)
  return {
    startMs: of(rows.startMs),
    day: of(rows.day),
    travelDeg: of(rows.travelDeg),
    logPower: of(rows.logPower),
    logPowerGain: of(rows.logPowerGain),
    vaneBeforeDeg: of(rows.vaneBeforeDeg),
    vaneAfterDeg: of(rows.vaneAfterDeg),
    pathDeg: index.flatMap((i) => rows.pathDeg.slice(i * PATH_LENGTH, (i + 1) * PATH_LENGTH)),
  }
}

/** Running sums of a log, from which the mean of any window is a difference. Samples that cannot be used do not count. */
class WindowSums {
  readonly #timeS: Float64Array
  readonly #perS: number
  readonly #count: Int32Array
  readonly #positive: Int32Array
  readonly #logPower: Float64Array
  readonly #vane: Float64Array
  readonly #direction: Float64Array

  constructor(timeS: Float64Array, log: Required<HighRateChunk>) {
    const n = timeS.length
    this.#timeS = timeS
    this.#count = new Int32Array(n + 1)
    this.#positive = new Int32Array(n + 1)
    this.#logPower = new Float64Array(n + 1)
    this.#vane = new Float64Array(n + 1)
    this.#direction = new Float64Array(n + 1)
    const steps = new Float64Array(n - 1)
    let heading = 0
    let last = NaN
    for (let i = 0; i < n; i++) {
      if (i > 0) steps[i - 1] = timeS[i]! - timeS[i - 1]!
      const vane = log.vane[i]!
      const power = log.power[i]!
      const position = log.nacellePosition[i]!
      if (position - position === 0) {
        const turned = position - last
        if (turned - turned === 0) heading += turned - 360 * Math.round(turned / 360)
        last = position
      }
      const usable = log.usable[i] === 1 && Math.abs(vane) <= VANE_MAX_DEG && position - position === 0
      const positive = usable && power > 0 && power < Infinity
      this.#count[i + 1] = this.#count[i]! + (usable ? 1 : 0)
      this.#positive[i + 1] = this.#positive[i]! + (positive ? 1 : 0)
      this.#logPower[i + 1] = this.#logPower[i]! + (positive ? Math.log(power) : 0)
      this.#vane[i + 1] = this.#vane[i]! + (usable ? vane : 0)
      this.#direction[i + 1] = this.#direction[i]! + (usable ? heading + vane : 0)
    }
    this.#perS = 1 / steps.sort()[(n - 1) >> 1]!
  }

  /** First sample at or after a time. */
  indexOf(atS: number): number {
    let low = 0
    let high = this.#timeS.length
    while (low < high) {
      const middle = (low + high) >> 1
      if (this.#timeS[middle]! < atS) low = middle + 1
      else high = middle
    }
    return low
  }

  /** Mean of ln P; NaN where samples lack, or the rotor gave nothing in one of them. */
  power(fromS: number, toS: number): number {
    const [from, to] = [this.indexOf(fromS), this.indexOf(toS)]
    const count = this.#positive[to]! - this.#positive[from]!
    if (count !== this.#count[to]! - this.#count[from]!) return NaN
    return this.#mean(this.#logPower, from, to, toS - fromS)
  }

  vane(fromS: number, toS: number): number {
    return this.#mean(this.#vane, this.indexOf(fromS), this.indexOf(toS), toS - fromS)
  }

  /** Mean of N + v, without seams, from an unknown zero. */
  direction(fromS: number, toS: number): number {
    return this.#mean(this.#direction, this.indexOf(fromS), this.indexOf(toS), toS - fromS)
  }

  #mean(sums: Float64Array, from: number, to: number, lengthS: number): number {
    const count = this.#count[to]! - this.#count[from]!
    // A window may hold a single sample of a slow log.
    const expected = Math.max(1, COVERED * (lengthS * this.#perS - 1))
    return count >= expected ? (sums[to]! - sums[from]!) / count : NaN
  }
}

function checked(chunk: HighRateChunk): Required<HighRateChunk> {
  const n = chunk.timeMs.length
  const usable = chunk.usable ?? new Uint8Array(n).fill(1)
  for (const [name, values] of Object.entries({ ...chunk, usable })) {
    if (values.length !== n) {
      throw new InputError('LENGTH_MISMATCH', `${name}: expected ${n} values, got ${values.length}`)
    }
  }
  return { ...chunk, usable }
}

function joined(first: Required<HighRateChunk>, second: Required<HighRateChunk>): Required<HighRateChunk> {
  const lastMs = first.timeMs[first.timeMs.length - 1]!
  if (second.timeMs.length > 0 && !(second.timeMs[0]! > lastMs)) {
    throw new InputError(
      'OUT_OF_RANGE',
      `timeMs: expected later than ${lastMs}, where the chunk before ends, got ${second.timeMs[0]!}`,
    )
  }
  return {
    timeMs: both(Float64Array, first.timeMs, second.timeMs),
    vane: both(Float64Array, first.vane, second.vane),
    power: both(Float64Array, first.power, second.power),
    nacellePosition: both(Float64Array, first.nacellePosition, second.nacellePosition),
    day: both(Int32Array, first.day, second.day),
    usable: both(Uint8Array, first.usable, second.usable),
  }
}

function both<T extends Float64Array | Int32Array | Uint8Array>(
  Kind: new (length: number) => T,
  first: T,
  second: T,
): T {
  const joint = new Kind(first.length + second.length)
  joint.set(first)
  joint.set(second, first.length)
  return joint
}

function tailOf(log: Required<HighRateChunk>, timeS: Float64Array): Required<HighRateChunk> {
  const fromS = timeS[timeS.length - 1]! - TAIL_S
  let from = 0
  while (timeS[from]! < fromS) from++
  return {
    timeMs: log.timeMs.slice(from),
    vane: log.vane.slice(from),
    power: log.power.slice(from),
    nacellePosition: log.nacellePosition.slice(from),
    day: log.day.slice(from),
    usable: log.usable.slice(from),
  }
}
