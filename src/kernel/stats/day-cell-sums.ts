import { InputError } from '../../errors.ts'
import type { DayWeights } from './day-weights.ts'

/**
 * Weighted sums of a regression per cell and day. Rows of one cell share a level; rows of one day are drawn together.
 * From these sums a slope over any choice of days costs as much as there are pairs of cell and day, not rows.
 */
export interface DayCellSums {
  readonly days: number
  readonly cells: number
  /** Pairs of cell `c` lie at [cellStart[c], cellStart[c + 1]). */
  readonly cellStart: Int32Array
  readonly day: Int32Array
  readonly w: Float64Array
  readonly wx: Float64Array
  readonly wy: Float64Array
  readonly wxx: Float64Array
  readonly wxy: Float64Array
}

/** Rows of a regression; all of length n. A row with weight 0 has no say. */
export interface RegressionRows {
  /** 0 to days - 1. */
  readonly day: ArrayLike<number>
  /** 0 to cells - 1. */
  readonly cell: ArrayLike<number>
  readonly x: ArrayLike<number>
  readonly y: ArrayLike<number>
  /** >= 0. */
  readonly weight: ArrayLike<number>
}

/**
 * @param size.days   number of days, cells: number of cells; indices of the rows lie below them.
 * @throws InputError LENGTH_MISMATCH, OUT_OF_RANGE
 */
export function dayCellSums(rows: RegressionRows, size: { days: number; cells: number }): DayCellSums {
  const n = rows.x.length
  for (const key of ['day', 'cell', 'y', 'weight'] as const) {
    if (rows[key].length !== n)
      throw new InputError('LENGTH_MISMATCH', `${key}: expected ${n} values, got ${rows[key].length}`)
  }
  const { days, cells } = size
  const slotOf = new Int32Array(days * cells).fill(-1)
  for (let i = 0; i < n; i++) {
    const day = rows.day[i]!
    const cell = rows.cell[i]!
    if (!(day >= 0 && day < days))
      throw new InputError('OUT_OF_RANGE', `day[${i}]: expected 0 to ${days - 1}, got ${day}`)
    if (!(cell >= 0 && cell < cells))
      throw new InputError('OUT_OF_RANGE', `cell[${i}]: expected 0 to ${cells - 1}, got ${cell}`)
    slotOf[cell * days + day] = 0
  }
  const cellStart = new Int32Array(cells + 1)
  let pairs = 0
  for (let c = 0; c < cells; c++) {
    cellStart[c] = pairs
    for (let d = 0; d < days; d++) if (slotOf[c * days + d] === 0) slotOf[c * days + d] = pairs++
  }
  cellStart[cells] = pairs
  const day = new Int32Array(pairs)
  for (let c = 0; c < cells; c++) {
    for (let d = 0; d < days; d++) if (slotOf[c * days + d]! >= 0) day[slotOf[c * days + d]!] = d
  }
  const w = new Float64Array(pairs)
  const wx = new Float64Array(pairs)
  const wy = new Float64Array(pairs)
  const wxx = new Float64Array(pairs)
  const wxy = new Float64Array(pairs)
  for (let i = 0; i < n; i++) {
    const slot = slotOf[rows.cell[i]! * days + rows.day[i]!]!
    const weight = rows.weight[i]!
    const x = rows.x[i]!
    const y = rows.y[i]!
    w[slot]! += weight
    wx[slot]! += weight * x
    wy[slot]! += weight * y
    wxx[slot]! += weight * x * x
    wxy[slot]! += weight * x * y
  }
  return { days, cells, cellStart, day, w, wx, wy, wxx, wxy }
}

/**
 * Slope of y on x with a level of its own for every cell, all days counted once: what remains of x and y after the
 * mean of their cell is taken out, regressed on each other.
 *
 * @returns slope; NaN where x does not vary inside any cell.
 */
export function slopeWithinCells(sums: DayCellSums): number {
  return slopeOver(sums, undefined, 0)
}

/**
 * The slope in every resample of days, levels refitted in each.
 *
 * @returns length `weights.resamples`; NaN where a resample holds no variation of x.
 * @throws InputError LENGTH_MISMATCH when weights and sums are of different windows
 */
export function resampledSlopes(sums: DayCellSums, weights: DayWeights): Float64Array {
  if (weights.days !== sums.days) {
    throw new InputError('LENGTH_MISMATCH', `weights: expected ${sums.days} days, got ${weights.days}`)
  }
  const slopes = new Float64Array(weights.resamples)
  for (let r = 0; r < weights.resamples; r++) slopes[r] = slopeOver(sums, weights.counts, r * weights.days)
  return slopes
}

function slopeOver(sums: DayCellSums, counts: Uint16Array | undefined, base: number): number {
  const { cells, cellStart, day, w, wx, wy, wxx, wxy } = sums
  let spread = 0
  let joint = 0
  for (let c = 0; c < cells; c++) {
    let n = 0
    let x = 0
    let y = 0
    let xx = 0
    let xy = 0
    for (let k = cellStart[c]!, end = cellStart[c + 1]!; k < end; k++) {
      const times = counts ? counts[base + day[k]!]! : 1
      if (times === 0) continue
      n += times * w[k]!
      x += times * wx[k]!
      y += times * wy[k]!
      xx += times * wxx[k]!
      xy += times * wxy[k]!
    }
    if (n > 0) {
      spread += xx - (x * x) / n
      joint += xy - (x * y) / n
    }
  }
  return spread > 1e-12 ? joint / spread : NaN
}
