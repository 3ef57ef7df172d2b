import {
  circularKurtosis,
  circularMean,
  circularMedian,
  circularQuantiles,
  circularSd,
  circularSkewness,
  vonMisesKappa,
  wrap180,
} from '../kernel/angle/index.ts'
import { studentQuantile } from '../kernel/stats/index.ts'
import type { TurbineFrame } from '../frame/index.ts'
import type { TurbineSheet } from '../sheet/index.ts'
import { runningBelowRated } from './vane-statistics.ts'

const HISTOGRAM_BIN_DEG = 1
const SECTOR_DEG = 30
type YawErrorGroup = TurbineSheet['yawError']['byWindSpeed'][number]

/**
 * Distribution of the yaw error g = v + d over all running rows below rated, from interval means, never cut.
 *
 * @param offsetDeg  d; null = not known: the vane is shown as it is, and the note says so.
 */
export function yawError(frame: TurbineFrame, offsetDeg: number | null): TurbineSheet['yawError'] {
  const rows = runningBelowRated(frame)
  const shift = offsetDeg ?? 0
  const errors = Float64Array.from(rows, (i) => wrap180(frame.vane[i]! + shift))
  const mean = circularMean(errors)
  const meanDeg = wrap180(mean.direction)
  const quantiles = circularQuantiles(errors, [0.05, 0.25, 0.5, 0.75, 0.95])
  return {
    meanDeg,
    medianDeg: wrap180(circularMedian(errors)),
    circularSdDeg: circularSd(errors),
    resultantLength: mean.resultant,
    kappa: vonMisesKappa(mean.resultant),
    skewness: circularSkewness(errors),
    kurtosis: circularKurtosis(errors),
    meanInterval95Deg: meanIntervalByDay(frame, rows, errors, meanDeg),
    quantilesDeg: {
      p05: quantiles[0]!,
      p25: quantiles[1]!,
      p50: quantiles[2]!,
      p75: quantiles[3]!,
      p95: quantiles[4]!,
    },
    histogram: histogram(errors),
    byWindSpeed: grouped(rows, errors, (i) => Math.floor(frame.windSpeed[i]!), 1),
    byDirection: grouped(
      rows,
      errors,
      (i) => Math.floor(frame.indicatedDirection[i]! / SECTOR_DEG),
      SECTOR_DEG,
    ),
    offsetUsedDeg: offsetDeg,
    note:
      offsetDeg === null
        ? 'd is not known: these are the angles of the vane as read'
        : 'v + d from interval means; direction sectors follow N + v, whose north is not surveyed',
    rows: rows.length,
  }
}

/** The mean's interval from the spread of daily means: rows within a day are not independent. */
function meanIntervalByDay(
  frame: TurbineFrame,
  rows: readonly number[],
  errors: Float64Array,
  meanDeg: number,
): [number, number] {
  const byDay = new Map<number, { sum: number; count: number }>()
  rows.forEach((i, k) => {
    const day = byDay.get(frame.day[i]!) ?? { sum: 0, count: 0 }
    day.sum += wrap180(errors[k]! - meanDeg)
    day.count++
    byDay.set(frame.day[i]!, day)
  })
  const days = byDay.size
  if (days < 2) return [NaN, NaN]
  // Ratio estimator of a clustered mean: residual sums per day against all rows.
  let squares = 0
  const overall = [...byDay.values()].reduce((sum, day) => sum + day.sum, 0) / rows.length
  for (const day of byDay.values()) squares += (day.sum - day.count * overall) ** 2
  const half = (studentQuantile(0.975, days - 1) * Math.sqrt((squares * days) / (days - 1))) / rows.length
  return [meanDeg - half, meanDeg + half]
}

function histogram(errors: Float64Array): TurbineSheet['yawError']['histogram'] {
  const counts = new Array<number>(360 / HISTOGRAM_BIN_DEG).fill(0)
  for (const error of errors) {
    if (Number.isNaN(error)) continue
    counts[Math.min(counts.length - 1, Math.floor((error + 180) / HISTOGRAM_BIN_DEG))]!++
  }
  // Empty ends are left out, so that the list is as long as the distribution is wide.
  const first = counts.findIndex((count) => count > 0)
  if (first < 0) return { binWidthDeg: HISTOGRAM_BIN_DEG, firstEdgeDeg: 0, counts: [] }
  const last = counts.findLastIndex((count) => count > 0)
  return {
    binWidthDeg: HISTOGRAM_BIN_DEG,
    firstEdgeDeg: first * HISTOGRAM_BIN_DEG - 180,
    counts: counts.slice(first, last + 1),
  }
}

function grouped(
  rows: readonly number[],
  errors: Float64Array,
  binOf: (row: number) => number,
  width: number,
): YawErrorGroup[] {
  const groups = new Map<number, number[]>()
  rows.forEach((i, k) => {
    const bin = binOf(i)
    if (Number.isNaN(bin)) return
    const group = groups.get(bin)
    if (group) group.push(errors[k]!)
    else groups.set(bin, [errors[k]!])
  })
  return [...groups]
    .sort(([a], [b]) => a - b)
    .map(([bin, group]) => ({
      from: bin * width,
      to: (bin + 1) * width,
      rows: group.length,
      meanDeg: wrap180(circularMean(group).direction),
      circularSdDeg: circularSd(group),
    }))
}
