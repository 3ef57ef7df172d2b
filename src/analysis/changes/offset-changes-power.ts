import { DEG_PER_RAD, RAD_PER_DEG } from '../../kernel/angle/index.ts'
import {
  changeInterval,
  changePoints,
  slopeCost,
  studentQuantile,
  type DayCellSums,
} from '../../kernel/stats/index.ts'
import { blockNoise } from './offset-changes-noise.ts'
import { fitOffset, type OffsetFit, type OffsetModel } from '../offset/offset-fit.ts'
import type { OffsetRows } from '../offset/offset-rows.ts'

/** Blocks of days, as the offset's own interval has them. */
const NOISE_DAYS = [1, 2, 4] as const
/** Days in the shortest state that power alone is asked to tell. */
const MIN_DAYS = 5
/** What a change costs, in variances times ln n. */
const PENALTY_PARAMETERS = 3

/** The offset regression of one turbine, day by day; a day that a given moment splits counts as two. */
export interface PowerByDay {
  readonly fit: OffsetFit
  /** Period of each piece: how many of the given moments lie before it. */
  readonly period: Int32Array
  /** Start of each piece, epoch ms; rising. */
  readonly startMs: Float64Array
  /** Sums of x x and x y, levels taken out; y is what the fitted offset leaves. */
  readonly xx: Float64Array
  readonly xy: Float64Array
  /** Variance of a piece with xx = 1, as it counts over days. */
  readonly noise: number
}

/**
 * Fits one offset to all rows, with the vane of each period moved by what is known of it, and keeps the sums per day:
 * their slopes are deviations of the offset (radians).
 *
 * @param moments  given moments, epoch ms, rising.
 * @param movedDeg  per period (one more than moments): degrees that the offset lies above that of the first period.
 * @returns null when the fit does not settle.
 */
export function powerByDay(
  rows: OffsetRows,
  clock: { firstMs: number; intervalMs: number },
  model: OffsetModel,
  moments: readonly number[],
  movedDeg: readonly number[],
): PowerByDay | null {
  const n = rows.vane.length
  const piece = new Int32Array(n)
  const period: number[] = []
  const startMs: number[] = []
  const vane = new Float64Array(n)
  let at = 0
  for (let i = 0; i < n; i++) {
    const timeMs = clock.firstMs + rows.position[i]! * clock.intervalMs
    while (at < moments.length && timeMs >= moments[at]!) at++
    if (i === 0 || rows.day[i] !== rows.day[i - 1] || at !== period.at(-1)) {
      period.push(at)
      startMs.push(timeMs)
    }
    piece[i] = period.length - 1
    vane[i] = rows.vane[i]! + movedDeg[at]! * RAD_PER_DEG
  }
  const fit = fitOffset({ ...rows, vane, day: piece, days: Math.max(1, period.length) }, model)
  if (!fit.converged) return null
  const { xx, xy } = daySums(fit.sums)
  return {
    fit,
    period: Int32Array.from(period),
    startMs: Float64Array.from(startMs),
    xx,
    xy,
    noise: blockNoise(xx, xy, NOISE_DAYS) * fit.stretch ** 2,
  }
}

/** Sums per day with the mean of the cell over all days taken out of x and y. */
function daySums({ layout, sums }: DayCellSums): { xx: Float64Array; xy: Float64Array } {
  const xx = new Float64Array(layout.days)
  const xy = new Float64Array(layout.days)
  for (let c = 0; c < layout.cells; c++) {
    let w = 0
    let wx = 0
    let wy = 0
    for (let k = layout.cellStart[c]!; k < layout.cellStart[c + 1]!; k++) {
      w += sums[5 * k]!
      wx += sums[5 * k + 1]!
      wy += sums[5 * k + 2]!
    }
    if (!(w > 0)) continue
    const x = wx / w
    const y = wy / w
    for (let k = layout.cellStart[c]!; k < layout.cellStart[c + 1]!; k++) {
      const day = layout.day[k]!
      const [n, sx, sy, sxx, sxy] = sums.subarray(5 * k, 5 * k + 5) as unknown as FiveSums
      xx[day]! += Math.max(0, sxx - 2 * x * sx + x * x * n)
      xy[day]! += sxy - x * sy - y * sx + x * y * n
    }
  }
  return { xx, xy }
}

type FiveSums = [w: number, wx: number, wy: number, wxx: number, wxy: number]

/** Deviation of the offset from the fitted one over the pieces [from, to), and its SD; degrees. NaN without rows. */
export function deviationOver(
  power: PowerByDay,
  from: number,
  to: number,
): { deg: number; sdDeg: number; halfWidthDeg: number } {
  let xx = 0
  let xy = 0
  let days = 0
  for (let d = from; d < to; d++) {
    xx += power.xx[d]!
    xy += power.xy[d]!
    if (power.xx[d]! > 0) days++
  }
  const sdDeg = xx > 0 ? Math.sqrt(power.noise / xx) * DEG_PER_RAD : NaN
  return {
    deg: xx > 0 ? (xy / xx) * DEG_PER_RAD : NaN,
    sdDeg,
    halfWidthDeg: studentQuantile(0.975, days - 1) * sdDeg,
  }
}

/** A change that power alone shows. Places are pieces: the change lies before piece `at`, surely in [low, high]. */
export interface PowerChange {
  readonly at: number
  readonly low: number
  readonly high: number
}

/** Changes of the offset inside the pieces [from, to), by the exact penalised search. */
export function searchPower(power: PowerByDay, from: number, to: number): PowerChange[] {
  if (!(power.noise > 0)) return []
  const xx = power.xx.subarray(from, to)
  const cost = slopeCost(xx, power.xy.subarray(from, to), new Float64Array(to - from))
  const penalty = PENALTY_PARAMETERS * Math.log(to - from) * power.noise
  const { changes } = changePoints(cost, { penalty, minLength: MIN_DAYS })
  return changes.map((change, k) => {
    const place = changeInterval(cost, {
      from: changes[k - 1] ?? 0,
      to: changes[k + 1] ?? to - from,
      scale: power.noise,
    })
    return { at: from + change, low: from + place.low - 1, high: from + place.high }
  })
}
