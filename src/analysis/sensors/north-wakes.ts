import { RAD_PER_DEG, wrap180 } from '../../kernel/angle/index.ts'
import { medianOf, type DayWeights } from '../../kernel/stats/index.ts'
import type { Frame, TurbineFrame } from '../../frame/index.ts'
import { farmGrid, onGrid } from '../neighbours/farm-grid.ts'
import { resampledHalfWidth } from '../offset/resampled-spread.ts'
import type { TrueNorth } from './nacelle-north.ts'
import { layoutOf, wakeLosses } from './north-wake-pattern.ts'

/** Pairs further apart than this, in rotor diameters, are not compared; of the others the nearest for each turbine. */
const LONGEST_PAIR_D = 12
const NEAREST = 6
/** Wind speeds of the farm, m/s, between which thrust is high and power below rated. */
const WAKE_MS = [5, 10.5] as const
/** A ratio of powers beyond e to this is cut. */
const MOST_LOG_RATIO = 1.5
/** Pairs and rows with fewer rows than this tell nothing. */
const FEW_ROWS = 2000
const FEW_PAIR_ROWS = 200
const FEWEST_DAYS = 5
/** Turns tried: whole degrees, then tenths this far around the best. */
const FINE_DEG = 8
/** Another turn this far off may reach so much of the best one's share, or the layout is ambiguous. */
const APART_DEG = 25
const MOST_OF_BEST = 0.7
/** Depth of the troughs, in units of what a usual wake takes: outside this it was no wake. */
const DEPTHS = [0.25, 3] as const
/** Half-width of what the comparison cannot see: wakes that drift sideways behind rotors that stand off. Common practice, no source. */
const DRIFT_DEG = 1
/** With a wider interval nothing is said, degrees. */
const WIDEST_DEG = 10

interface Pair {
  readonly a: number
  readonly b: number
  readonly rows: Float64Array
  readonly sum: Float64Array
}

export interface WakeNorth extends TrueNorth {
  readonly source: 'wakes'
  readonly pairs: number
  readonly rows: number
  readonly days: number
  /** Depth of the troughs in units of what a usual wake takes. */
  readonly depth: number
}

/**
 * By how much the farm's consensus direction is turned against true north, from the wakes: the ratio of the powers of two
 * turbines has its trough where the wind blows along the bearing from one to the other. All pairs that are near each other
 * share one turn; what the wakes of third turbines do to a pair is in the pattern that is looked for, the depth is fitted, and
 * each pair has a level and a slow course of its own around the compass. Interval by resampling days.
 *
 * What this gives a turbine is n - d against true north, like the consensus itself.
 *
 * @param consensusDeg  direction of the farm on its clock, degrees; NaN = unknown.
 * @returns null where the layout is not known, where rows are too few, or where nothing stands out.
 */
export function northByWakes(
  frame: Frame,
  consensusDeg: Float64Array,
  dayWeights: readonly DayWeights[],
): WakeNorth | null {
  const layout = layoutOf(frame.turbines)
  if (!layout) return null
  const loss = wakeLosses(layout)
  const grid = farmGrid(frame)
  const logPower = onGrid(grid, (turbine, row) => comparedPower(turbine, row))
  const speed = onGrid(grid, (turbine, row) => turbine.windSpeed[row]!)
  const bin = consensusDeg.map((direction, t) => {
    const farm = medianOf(speed.map((values) => values[t]!).filter((value) => !Number.isNaN(value)))
    return farm >= WAKE_MS[0] && farm <= WAKE_MS[1] && direction >= 0 ? Math.floor(direction) % 360 : -1
  })
  const ratio = ({ a, b }: Pair, t: number): number => {
    const value = logPower[a]![t]! - logPower[b]![t]!
    return Math.max(-MOST_LOG_RATIO, Math.min(MOST_LOG_RATIO, value))
  }
  const pairs: Pair[] = nearPairs(layout).map(([a, b]) => ({
    a,
    b,
    rows: new Float64Array(360),
    sum: new Float64Array(360),
  }))
  for (const pair of pairs) {
    for (let t = 0; t < bin.length; t++) {
      const y = bin[t]! >= 0 ? ratio(pair, t) : NaN
      if (Number.isNaN(y)) continue
      pair.rows[bin[t]!]!++
      pair.sum[bin[t]!]! += y
    }
  }
  const told = pairs.filter(({ rows }) => total(rows) >= FEW_PAIR_ROWS)
  const rows = told.reduce((sum, pair) => sum + total(pair.rows), 0)
  if (rows < FEW_ROWS) return null

  const patterns = told.map((pair) => new PairPattern(pair, loss[pair.a]!, loss[pair.b]!))
  const found = bestTurn(patterns)
  if (!found) return null
  const { shiftDeg, depth } = found
  const scores = patterns.map((pattern) => pattern.scoresAt(shiftDeg, depth))
  const days = frame.calendar.days
  const pull = new Float64Array(days)
  const weight = new Float64Array(days)
  told.forEach((pair, p) => {
    const { fitted, slope } = scores[p]!
    for (let t = 0; t < bin.length; t++) {
      const b = bin[t]!
      const y = b >= 0 ? ratio(pair, t) : NaN
      if (Number.isNaN(y)) continue
      const day = grid.day[t]!
      pull[day]! += (y - fitted[b]!) * slope[b]!
      weight[day]! += slope[b]! * slope[b]!
    }
  })
  const usedDays = weight.filter((value) => value > 0).length
  if (usedDays < FEWEST_DAYS) return null
  const statistical = Math.max(
    ...dayWeights
      .map((weights) => resampledHalfWidth(resampledShifts(pull, weight, weights), weights, usedDays))
      .filter((half) => !Number.isNaN(half)),
  )
  const halfWidthDeg = Math.hypot(statistical, DRIFT_DEG)
  if (!(halfWidthDeg <= WIDEST_DEG)) return null
  return {
    source: 'wakes',
    shiftDeg,
    halfWidthDeg,
    pairs: told.length,
    rows,
    days: usedDays,
    depth,
    note: `wakes of ${told.length} pairs of turbines tie the consensus to true north; what that gives is n - d, n is that plus d. Wakes that drift sideways are allowed for by ${DRIFT_DEG} degree`,
  }
}

/** ln of the power of a row that runs unlimited; else NaN. */
function comparedPower(turbine: TurbineFrame, row: number): number {
  if (turbine.running[row] !== 1 || turbine.limited[row] === 1) return NaN
  const power = turbine.power[row]!
  return power > 0 ? Math.log(power) : NaN
}

function nearPairs(layout: NonNullable<ReturnType<typeof layoutOf>>): [number, number][] {
  const chosen = new Map<string, [number, number]>()
  layout.forEach((own, a) => {
    layout
      .map((other, b) => ({
        b,
        distance: Math.hypot(other.eastM - own.eastM, other.northM - own.northM),
      }))
      .filter(({ b, distance }) => b !== a && distance > 0 && distance <= LONGEST_PAIR_D * own.diameterM)
      .sort((one, two) => one.distance - two.distance || one.b - two.b)
      .slice(0, NEAREST)
      .forEach(({ b }) => {
        const pair: [number, number] = a < b ? [a, b] : [b, a]
        chosen.set(pair.join(), pair)
      })
  })
  return [...chosen.values()].sort((one, two) => one[0] - two[0] || one[1] - two[1])
}

/** What a pair's ratio should look like around the compass, and what it does. */
class PairPattern {
  readonly #rows: Float64Array
  /** Mean ratio of each bin, as it is and with level and course taken out. */
  readonly #raw: Float64Array
  readonly #mean: Float64Array
  readonly #expected: Float64Array
  readonly #course: readonly Float64Array[]

  constructor(pair: Pair, lossA: Float64Array, lossB: Float64Array) {
    this.#rows = pair.rows
    this.#expected = lossA.map((value, b) => value - lossB[b]!)
    // Level and first harmonic, each orthogonal to those before it, so that they can be taken out one by one.
    const course: Float64Array[] = []
    for (const term of [() => 1, Math.sin, Math.cos]) {
      const column = Float64Array.from({ length: 360 }, (_, b) => term((b + 0.5) * RAD_PER_DEG))
      for (const before of course) this.#takeOut(column, before)
      course.push(column)
    }
    this.#course = course
    this.#raw = pair.sum.map((sum, b) => (pair.rows[b]! > 0 ? sum / pair.rows[b]! : 0))
    this.#mean = this.#raw.slice()
    for (const column of course) this.#takeOut(this.#mean, column)
  }

  /** Sums of x x and x y with the consensus turned by `shift` against true north. */
  sumsAt(shiftDeg: number): { xx: number; xy: number } {
    const x = this.#turned(shiftDeg)
    return { xx: this.#dot(x, x), xy: this.#dot(x, this.#mean) }
  }

  /** At the turn found: what is fitted to the raw ratio of each bin, and how the fit answers to the turn. */
  scoresAt(shiftDeg: number, depth: number): { fitted: Float64Array; slope: Float64Array } {
    const x = this.#turned(shiftDeg)
    const rising = this.#turned(shiftDeg + 0.5)
    const falling = this.#turned(shiftDeg - 0.5)
    return {
      fitted: x.map((value, b) => depth * value + this.#raw[b]! - this.#mean[b]!),
      slope: rising.map((value, b) => depth * (value - falling[b]!)),
    }
  }

  #turned(shiftDeg: number): Float64Array {
    const x = new Float64Array(360)
    for (let b = 0; b < 360; b++) {
      const at = (((b - shiftDeg) % 360) + 360) % 360
      const low = Math.floor(at)
      const part = at - low
      const next = this.#expected[(low + 1) % 360]!
      x[b] = this.#expected[low % 360]! * (1 - part) + next * part
    }
    for (const column of this.#course) this.#takeOut(x, column)
    return x
  }

  #dot(one: Float64Array, two: Float64Array): number {
    let sum = 0
    for (let b = 0; b < 360; b++) sum += this.#rows[b]! * one[b]! * two[b]!
    return sum
  }

  #takeOut(values: Float64Array, column: Float64Array): void {
    const size = this.#dot(column, column)
    if (!(size > 0)) return
    const share = this.#dot(values, column) / size
    for (let b = 0; b < 360; b++) values[b]! -= share * column[b]!
  }
}

/** The turn at which the patterns of all pairs, with one depth, explain most. */
function bestTurn(patterns: readonly PairPattern[]): { shiftDeg: number; depth: number } | null {
  const explained = (shiftDeg: number): { share: number; depth: number } => {
    let xx = 0
    let xy = 0
    for (const pattern of patterns) {
      const sums = pattern.sumsAt(shiftDeg)
      xx += sums.xx
      xy += sums.xy
    }
    return xy > 0 && xx > 0 ? { share: (xy * xy) / xx, depth: xy / xx } : { share: 0, depth: 0 }
  }
  const coarse = Array.from({ length: 360 }, (_, shift) => explained(shift).share)
  const top = coarse.indexOf(Math.max(...coarse))
  const rival = Math.max(...coarse.filter((_, shift) => Math.abs(wrap180(shift - top)) >= APART_DEG))
  if (!(coarse[top]! > 0) || rival > MOST_OF_BEST * coarse[top]!) return null
  let best = { shiftDeg: NaN, share: 0, depth: 0 }
  for (let tenth = -10 * FINE_DEG; tenth <= 10 * FINE_DEG; tenth += 1) {
    const shiftDeg = top + tenth / 10
    const here = explained(shiftDeg)
    if (here.share > best.share) best = { shiftDeg, ...here }
  }
  if (!(best.depth >= DEPTHS[0] && best.depth <= DEPTHS[1])) return null
  return { shiftDeg: wrap180(best.shiftDeg), depth: best.depth }
}

/** Shift of each resample against the one found, degrees. */
function resampledShifts(pull: Float64Array, weight: Float64Array, weights: DayWeights): Float64Array {
  const { days, resamples, counts } = weights
  return Float64Array.from({ length: resamples }, (_, r) => {
    let a = 0
    let b = 0
    for (let d = 0; d < days; d++) {
      const times = counts[r * days + d]!
      a += times * pull[d]!
      b += times * weight[d]!
    }
    return b > 0 ? a / b : NaN
  })
}

function total(values: Float64Array): number {
  return values.reduce((sum, value) => sum + value, 0)
}
