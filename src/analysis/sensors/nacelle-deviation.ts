import { circularMean, wrap180 } from '../../kernel/angle/index.ts'
import { medianOfOthers } from '../changes/offset-changes-heading.ts'
import { farmDirection } from '../neighbours/farm-direction.ts'
import type { FarmGrid, GridChannel } from '../neighbours/farm-grid.ts'

/**
 * N + v of each turbine less the median of what the others show at the same time, each about its own mean: degrees,
 * [-180, 180), off by a constant of the turbine. Half of the others may be wrong in any way.
 *
 * @param indicated  N + v, [i][t]; NaN = not to be heard.
 * @returns [i][t]; NaN with fewer than two others.
 */
export function deviations(grid: FarmGrid, indicated: GridChannel): GridChannel {
  const { consensusDeg, constantDeg } = farmDirection(grid, indicated)
  const local = indicated.map((values, i) =>
    values.map((value, t) => wrap180(value - consensusDeg[t]! - constantDeg[i]!)),
  )
  const others = medianOfOthers(local, local)
  return local.map((values, i) => values.map((value, t) => wrap180(value - others[i]![t]!)))
}

/** Angles of an hour: their mean, how well they agree, and where they stand. */
export interface Hour {
  /** Rows [from, to) of the grid. */
  readonly from: number
  readonly to: number
  readonly deg: number
  /** Resultant length of the hour's rows, 0 to 1. */
  readonly agreement: number
}

/** The hours of a series with at least three rows and half of those due, in order. */
export function hoursOf(values: Float64Array, intervalS: number): Hour[] {
  const rowsPerHour = Math.max(1, Math.round(3600 / intervalS))
  const least = Math.min(rowsPerHour, Math.max(3, rowsPerHour / 2))
  const hours: Hour[] = []
  for (let from = 0; from < values.length; from += rowsPerHour) {
    const to = Math.min(values.length, from + rowsPerHour)
    const { direction, resultant, count } = circularMean(values.subarray(from, to))
    if (count >= least && !Number.isNaN(direction))
      hours.push({ from, to, deg: wrap180(direction), agreement: resultant })
  }
  return hours
}
