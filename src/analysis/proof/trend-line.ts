import { studentQuantile } from '../../kernel/stats/index.ts'
import type { TrendLine } from '../../sheet/index.ts'
import { NORMAL_95 } from '../offset/resampled-spread.ts'

const YEAR_MS = 365.2425 * 86_400_000

/** One number of one window. */
export interface TrendValue {
  /** Middle of the window, epoch ms. */
  readonly atMs: number
  readonly value: number
  /** At 95 %; NaN: not known, then windows scatter about their line by chance alone. */
  readonly halfWidth: number
}

/**
 * Straight line through the numbers of several windows, and what the last one changed.
 *
 * With errors known, each window weighs by its own, and where windows scatter about the line by more than that, the interval
 * is as much wider. Without, all weigh alike, and the scatter about the line is the error (t quantile).
 *
 * @param values  in order of time; NaN = missing, skipped.
 * @returns null where fewer than two windows have the number. `perYear` NaN-free: null with fewer than three windows.
 */
export function trendLine(quantity: string, values: readonly TrendValue[]): TrendLine | null {
  const known = values.filter(({ value }) => Number.isFinite(value))
  const last = known.at(-1)
  const before = known.at(-2)
  if (!last || !before) return null
  const step = last.value - before.value
  const stepHalf = Math.hypot(last.halfWidth, before.halfWidth)
  const slope = known.length >= 3 ? slopeOf(known) : null
  return {
    quantity,
    windows: known.length,
    perYear: slope ? slope.perYear : null,
    interval95: slope ? [slope.perYear - slope.half, slope.perYear + slope.half] : [null, null],
    beyondChance: slope !== null && Math.abs(slope.perYear) > slope.half,
    lastChange: step,
    lastChange95: Number.isNaN(stepHalf) ? [null, null] : [step - stepHalf, step + stepHalf],
    lastBeyondChance: Math.abs(step) > stepHalf,
  }
}

function slopeOf(known: readonly TrendValue[]): { perYear: number; half: number } | null {
  const hasErrors = known.every(({ halfWidth }) => halfWidth > 0)
  const weight = known.map(({ halfWidth }) => (hasErrors ? (NORMAL_95 / halfWidth) ** 2 : 1))
  const years = known.map(({ atMs }) => (atMs - known[0]!.atMs) / YEAR_MS)
  const total = weight.reduce((sum, w) => sum + w, 0)
  const mean = (of: readonly number[]): number => of.reduce((sum, x, k) => sum + weight[k]! * x, 0) / total
  const x0 = mean(years)
  const y0 = mean(known.map(({ value }) => value))
  let xx = 0
  let xy = 0
  known.forEach(({ value }, k) => {
    xx += weight[k]! * (years[k]! - x0) ** 2
    xy += weight[k]! * (years[k]! - x0) * (value - y0)
  })
  if (!(xx > 0)) return null
  const perYear = xy / xx
  const freedom = known.length - 2
  const scatter =
    known.reduce(
      (sum, { value }, k) => sum + weight[k]! * (value - y0 - perYear * (years[k]! - x0)) ** 2,
      0,
    ) / freedom
  const half = hasErrors
    ? NORMAL_95 * Math.sqrt(Math.max(1, scatter) / xx)
    : studentQuantile(0.975, freedom) * Math.sqrt(scatter / xx)
  return { perYear, half }
}
