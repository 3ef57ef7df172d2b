import { InputError } from '../../errors.ts'
import type { DayWeights } from './day-weights.ts'

/** Sums kept for a pair: of w, wx, wy, wxx, wxy. */
const SUMS = 5
/** Less variation of x than this is none. */
const LEAST_SPREAD = 1e-12

/**
 * Which pair of cell and day each row of a regression belongs to. Rows of one cell share a level; rows of one day are
 * drawn together. Only pairs with rows are kept.
 */
export interface DayCells {
  readonly days: number
  readonly cells: number
  /** Pairs of cell `c` lie at [cellStart[c], cellStart[c + 1]). */
  readonly cellStart: Int32Array
  /** Day of each pair. */
  readonly day: Int32Array
  /** Pair of each row; length n. */
  readonly pairOf: Int32Array
}

/**
 * Weighted sums of a regression per pair of cell and day. From these a slope over any choice of days costs as much as
 * there are pairs, not rows.
 */
export interface DayCellSums {
  readonly layout: DayCells
  /** Sums of w, wx, wy, wxx and wxy of pair k at [5 k, 5 k + 5). */
  readonly sums: Float64Array
}

/**
 * @param day   0 to days - 1, integer; length n.
 * @param cell  0 to cells - 1, integer; length n.
 * @throws InputError LENGTH_MISMATCH, OUT_OF_RANGE
 */
export function dayCells(
  day: ArrayLike<number>,
  cell: ArrayLike<number>,
  size: { days: number; cells: number },
): DayCells {
  const n = day.length
  if (cell.length !== n)
    throw new InputError('LENGTH_MISMATCH', `cell: expected ${n} values, got ${cell.length}`)
  const { days, cells } = size
  const slot = new Int32Array(days * cells).fill(-1)
  for (let i = 0; i < n; i++) {
    const d = day[i]!
    const c = cell[i]!
    if (!(d >= 0 && d < days))
      throw new InputError('OUT_OF_RANGE', `day[${i}]: expected 0 to ${days - 1}, got ${d}`)
    if (!(c >= 0 && c < cells))
      throw new InputError('OUT_OF_RANGE', `cell[${i}]: expected 0 to ${cells - 1}, got ${c}`)
    slot[c * days + d] = 0
  }
  const cellStart = new Int32Array(cells + 1)
  const pairDays: number[] = []
  for (let c = 0; c < cells; c++) {
    cellStart[c] = pairDays.length
    for (let d = 0; d < days; d++) {
      if (slot[c * days + d] === 0) slot[c * days + d] = pairDays.push(d) - 1
    }
  }
  cellStart[cells] = pairDays.length
  const pairOf = new Int32Array(n)
  for (let i = 0; i < n; i++) pairOf[i] = slot[cell[i]! * days + day[i]!]!
  return { days, cells, cellStart, day: Int32Array.from(pairDays), pairOf }
}

/**
 * @param x, y, weight  length n, as the layout; weight >= 0: a row with weight 0 has no say.
 * @throws InputError LENGTH_MISMATCH
 */
export function dayCellSums(
  layout: DayCells,
  x: Float64Array,
  y: Float64Array,
  weight: Float64Array,
): DayCellSums {
  const n = layout.pairOf.length
  for (const [name, values] of [
    ['x', x],
    ['y', y],
    ['weight', weight],
  ] as const) {
    if (values.length !== n)
      throw new InputError('LENGTH_MISMATCH', `${name}: expected ${n} values, got ${values.length}`)
  }
  const sums = new Float64Array(layout.day.length * SUMS)
  for (let i = 0; i < n; i++) {
    const at = layout.pairOf[i]! * SUMS
    const w = weight[i]!
    const wx = w * x[i]!
    sums[at]! += w
    sums[at + 1]! += wx
    sums[at + 2]! += w * y[i]!
    sums[at + 3]! += wx * x[i]!
    sums[at + 4]! += wx * y[i]!
  }
  return { layout, sums }
}

/**
 * Slope of y on x with a level of its own for every cell, all days counted once: what remains of x and y after the
 * mean of their cell is taken out, regressed on each other.
 *
 * @returns slope; NaN where x does not vary inside any cell.
 */
export function slopeWithinCells(sums: DayCellSums): number {
  const moments = noMoments(sums)
  withinCells(sums, new Float64Array(sums.layout.days).fill(1), moments)
  return slopeOver(moments)
}

/**
 * The slope in every resample of days, levels refitted in each.
 *
 * @returns length `weights.resamples`; NaN where a resample holds no variation of x.
 * @throws InputError LENGTH_MISMATCH when weights and sums are of different windows
 */
export function resampledSlopes(sums: DayCellSums, weights: DayWeights): Float64Array {
  const slopes = new Float64Array(weights.resamples)
  overResamples(sums, weights, (moments, r) => (slopes[r] = slopeOver(moments)))
  return slopes
}

/**
 * The same for groups of cells at once, at the cost of a single pass.
 *
 * @param groups  cells of each group; a cell may be in any number of groups.
 * @returns in the order of the groups: slope with all days counted once, and in every resample.
 * @throws InputError LENGTH_MISMATCH when weights and sums are of different windows
 */
export function groupSlopes(
  sums: DayCellSums,
  groups: readonly (readonly number[])[],
  weights: DayWeights,
): { slope: number; resampled: Float64Array }[] {
  const slopes = groups.map(() => ({ slope: NaN, resampled: new Float64Array(weights.resamples) }))
  overResamples(sums, weights, (moments, r) => {
    groups.forEach((cells, g) => (slopes[g]!.resampled[r] = slopeOver(moments, cells)))
  })
  const moments = noMoments(sums)
  withinCells(sums, new Float64Array(sums.layout.days).fill(1), moments)
  groups.forEach((cells, g) => (slopes[g]!.slope = slopeOver(moments, cells)))
  return slopes
}

/**
 * Mean of y - slope x in each cell, all days counted once.
 *
 * @returns length `cells`; 0 for a cell without weight.
 */
export function cellLevels({ layout, sums }: DayCellSums, slope: number): Float64Array {
  const level = new Float64Array(layout.cells)
  for (let c = 0; c < layout.cells; c++) {
    let w = 0
    let remainder = 0
    for (let k = layout.cellStart[c]!; k < layout.cellStart[c + 1]!; k++) {
      w += sums[k * SUMS]!
      remainder += sums[k * SUMS + 2]! - slope * sums[k * SUMS + 1]!
    }
    level[c] = w > 0 ? remainder / w : 0
  }
  return level
}

/** Per cell: sums of squares of x, and of products of x and y, about the means of the cell. */
interface Moments {
  readonly spread: Float64Array
  readonly joint: Float64Array
}

function noMoments({ layout }: DayCellSums): Moments {
  return { spread: new Float64Array(layout.cells), joint: new Float64Array(layout.cells) }
}

function overResamples(
  sums: DayCellSums,
  weights: DayWeights,
  take: (moments: Moments, resample: number) => void,
): void {
  const { days } = sums.layout
  if (weights.days !== days) {
    throw new InputError('LENGTH_MISMATCH', `weights: expected ${days} days, got ${weights.days}`)
  }
  const moments = noMoments(sums)
  const times = new Float64Array(days)
  for (let r = 0; r < weights.resamples; r++) {
    for (let d = 0; d < days; d++) times[d] = weights.counts[r * days + d]!
    withinCells(sums, times, moments)
    take(moments, r)
  }
}

/** @param times  how often each day counts. */
function withinCells({ layout, sums }: DayCellSums, times: Float64Array, { spread, joint }: Moments): void {
  const { cells, cellStart, day } = layout
  for (let c = 0; c < cells; c++) {
    let n = 0
    let x = 0
    let y = 0
    let xx = 0
    let xy = 0
    // Days that are not drawn are multiplied by 0: a branch that is taken at random costs more than the products.
    for (let k = cellStart[c]!, end = cellStart[c + 1]!; k < end; k++) {
      const w = times[day[k]!]!
      const at = k * SUMS
      n += w * sums[at]!
      x += w * sums[at + 1]!
      y += w * sums[at + 2]!
      xx += w * sums[at + 3]!
      xy += w * sums[at + 4]!
    }
    spread[c] = n > 0 ? xx - (x * x) / n : 0
    joint[c] = n > 0 ? xy - (x * y) / n : 0
  }
}

/** Over some cells, or all. */
function slopeOver({ spread, joint }: Moments, cells?: readonly number[]): number {
  let [xx, xy] = [0, 0]
  const count = cells?.length ?? spread.length
  for (let k = 0; k < count; k++) {
    const c = cells ? cells[k]! : k
    xx += spread[c]!
    xy += joint[c]!
  }
  return xx > LEAST_SPREAD ? xy / xx : NaN
}
