import { DEG_PER_RAD, wrap180 } from '../../kernel/angle/index.ts'
import { resampledSlopes, type DayWeights } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { OffsetFit } from './offset-fit.ts'
import { resampledHalfWidth } from './resampled-spread.ts'
import { runningBelowRated } from '../vane-statistics.ts'

/** Half-widths at 95 % of d and of m, degrees, from the scatter between days. */
export interface OffsetSpread {
  readonly offset: number
  readonly standing: number
}

/** Sums of the running vane below rated, per day: its mean turns d into m. */
export interface VaneByDay {
  readonly meanDeg: number
  readonly sin: Float64Array
  readonly cos: Float64Array
}

export function vaneByDay(frame: TurbineFrame, days: number): VaneByDay {
  const sin = new Float64Array(days)
  const cos = new Float64Array(days)
  let allSin = 0
  let allCos = 0
  for (const i of runningBelowRated(frame)) {
    const angle = frame.vane[i]! / DEG_PER_RAD
    sin[frame.day[i]!]! += Math.sin(angle)
    cos[frame.day[i]!]! += Math.cos(angle)
    allSin += Math.sin(angle)
    allCos += Math.cos(angle)
  }
  return { meanDeg: wrap180(Math.atan2(allSin, allCos) * DEG_PER_RAD), sin, cos }
}

/**
 * Error of a fitted offset from the scatter between days: days in blocks are resampled, the widest block length counts.
 *
 * @returns NaN when the days do not even make two blocks of a single day.
 */
export function offsetSpread(
  fit: OffsetFit,
  vane: VaneByDay,
  dayWeights: readonly DayWeights[],
  usedDays: number,
): OffsetSpread {
  let widest = { offset: NaN, standing: NaN }
  for (const weights of dayWeights) {
    const offset = resampledSlopes(fit.sums, weights).map((slope) => slope * fit.stretch * DEG_PER_RAD)
    const next = {
      offset: resampledHalfWidth(offset, weights, usedDays),
      standing: resampledHalfWidth(withMeanVane(offset, vane, weights), weights, usedDays),
    }
    if (!Number.isNaN(next.standing) && !(widest.standing >= next.standing)) widest = next
  }
  return widest
}

/** Half-width at 95 % of the mean vane alone, degrees, from whole days in blocks, the widest length; NaN as `offsetSpread`. */
export function meanVaneSpread(vane: VaneByDay, dayWeights: readonly DayWeights[], usedDays: number): number {
  let widest = NaN
  for (const weights of dayWeights) {
    const resampled = withMeanVane(new Float64Array(weights.resamples), vane, weights)
    const half = resampledHalfWidth(resampled, weights, usedDays)
    if (!Number.isNaN(half) && !(widest >= half)) widest = half
  }
  return widest
}

function withMeanVane(offset: Float64Array, vane: VaneByDay, weights: DayWeights): Float64Array {
  const standing = new Float64Array(offset.length)
  for (let r = 0; r < offset.length; r++) {
    let sin = 0
    let cos = 0
    for (let d = 0; d < weights.days; d++) {
      const times = weights.counts[r * weights.days + d]!
      sin += times * vane.sin[d]!
      cos += times * vane.cos[d]!
    }
    standing[r] = offset[r]! + wrap180(Math.atan2(sin, cos) * DEG_PER_RAD - vane.meanDeg)
  }
  return standing
}
