import {
  cellLevels,
  dayCells,
  dayCellSums,
  huberWeight,
  robustSd,
  robustStretch,
  serialNoise,
  slopeWithinCells,
  whiten,
  type DayCellSums,
} from '../../kernel/stats/index.ts'
import type { FarmGrid, GridChannel } from './farm-grid.ts'

/** Direction sectors in which a turbine has a level of its own against its neighbours, degrees. */
const SECTOR_DEG = 15
const SECTORS = 360 / SECTOR_DEG
const LEVEL_ROUNDS = 4
const ROBUST_ROUNDS = 4
const CLIP = 3
/** Noise is measured in at most so many groups of rows alike in unrest, of at least so many rows. */
const MOST_UNREST_GROUPS = 10
const ROWS_OF_UNREST_GROUP = 100
/** A group quieter than this share of all is not believed. */
const LEAST_SHARE_OF_SD = 0.2
/** Rows of a turbine below which it is not compared. */
const MIN_ROWS = 200

export interface NeighbourQuestion {
  readonly grid: FarmGrid
  readonly days: number
  /** Consensus direction, degrees, [t]; NaN: the interval is left out. */
  readonly directionDeg: Float64Array
  /** What is compared with the neighbours, [i][t]; NaN: not compared. */
  readonly own: GridChannel
  /** What the neighbours are taken to show, [i][t]; NaN: not a neighbour at that time. */
  readonly others: GridChannel
  /** Regressor of each turbine's own coefficient, [i][t]. */
  readonly x: GridChannel
  /** The coefficient that `others` still contains, with this regressor; null: none. */
  readonly otherX: GridChannel | null
  /** Regressors with a coefficient of no interest, [l][i][t]; the neighbours' mean is taken out of each. */
  readonly nuisance: readonly GridChannel[]
  /** What the noise of an interval grows with, [t]: rows count by the inverse of the variance at its level. NaN = not known. */
  readonly unrest: Float64Array
}

export interface NeighbourSlope {
  /** Sums over days and sectors: their slope is that of the difference to the neighbours on x. */
  readonly sums: DayCellSums
  readonly direct: number
  /** Deviations of resampled slopes times this are those of the estimate, as robust weights let it spread. */
  readonly stretch: number
  readonly rows: number
  readonly days: number
}

export interface NeighbourSlopes {
  /** Per turbine; null where there are too few rows. */
  readonly slopes: readonly (NeighbourSlope | null)[]
  /** Coefficient of each turbine after what its neighbours share is solved for; NaN where null. */
  readonly coefficient: Float64Array
  /** Turns direct slopes (of the sample or of a resample) into coefficients. */
  readonly solve: (direct: ArrayLike<number>) => Float64Array
}

/**
 * Regresses, for every turbine, its difference to the mean of its neighbours at the same time on a regressor of its own.
 * Levels by sector of wind direction are taken out, so that gains, terrain and speed-up do not matter; noise with
 * memory is filtered; what the neighbours contain of their own coefficients is solved for, for all at once.
 */
export function neighbourSlopes(question: NeighbourQuestion): NeighbourSlopes {
  const { grid } = question
  const k = grid.turbines.length
  const sector = Int32Array.from(question.directionDeg, (angle) =>
    Number.isNaN(angle) ? -1 : Math.floor(angle / SECTOR_DEG) % SECTORS,
  )
  const others = withoutLevels(question.others, sector, grid.length)
  const own = question.own === question.others ? others : levelledAgainst(question.own, others, sector)
  const prepared: Prepared = {
    own,
    others,
    sector,
    sum: totals(others, others),
    nuisanceSums: question.nuisance.map((values) => totals(values, others)),
  }
  const slopes: (NeighbourSlope | null)[] = []
  const coupling = new Float64Array(k * k)
  for (let i = 0; i < k; i++) slopes.push(compareOne(question, prepared, i, coupling))
  const solve = (direct: ArrayLike<number>): Float64Array => solveCoupled(direct, coupling, slopes)
  return {
    slopes,
    solve,
    coefficient: solve(slopes.map((slope) => slope?.direct ?? NaN)),
  }
}

/** Sum and count over turbines at each interval. */
interface Totals {
  readonly sum: Float64Array
  readonly count: Int32Array
}

interface Prepared {
  readonly own: GridChannel
  readonly others: GridChannel
  readonly sector: Int32Array
  readonly sum: Totals
  readonly nuisanceSums: readonly Totals[]
}

/** Totals of `values` over the turbines that are neighbours, i.e. have a value in `others`. */
function totals(values: GridChannel, others: GridChannel): Totals {
  const length = values[0]?.length ?? 0
  const sum = new Float64Array(length)
  const count = new Int32Array(length)
  values.forEach((series, j) => {
    const neighbour = others[j]!
    for (let t = 0; t < length; t++) {
      if (Number.isNaN(neighbour[t]!) || Number.isNaN(series[t]!)) continue
      sum[t]! += series[t]!
      count[t]!++
    }
  })
  return { sum, count }
}

function compareOne(
  question: NeighbourQuestion,
  prepared: Prepared,
  i: number,
  coupling: Float64Array,
): NeighbourSlope | null {
  const { grid, nuisance } = question
  const { own, others, sector, sum } = prepared
  const isNeighbour = others[i]!
  const at: number[] = []
  for (let t = 0; t < grid.length; t++) {
    if (sector[t]! < 0 || Number.isNaN(own[i]![t]!) || Number.isNaN(question.x[i]![t]!)) continue
    const neighbours = sum.count[t]! - (Number.isNaN(isNeighbour[t]!) ? 0 : 1)
    if (neighbours === 0 || nuisance.some((values) => Number.isNaN(values[i]![t]!))) continue
    at.push(t)
  }
  const n = at.length
  if (n < MIN_ROWS) return null
  const x = new Float64Array(n)
  const y = new Float64Array(n)
  const z = nuisance.map(() => new Float64Array(n))
  const day = new Int32Array(n)
  const cell = new Int32Array(n)
  for (let r = 0; r < n; r++) {
    const t = at[r]!
    x[r] = question.x[i]![t]!
    y[r] = own[i]![t]! - meanOfOthers(sum, others[i]!, others[i]!, t)
    for (let l = 0; l < z.length; l++) {
      z[l]![r] =
        nuisance[l]![i]![t]! - meanOfOthers(prepared.nuisanceSums[l]!, nuisance[l]![i]!, others[i]!, t)
    }
    day[r] = grid.day[t]!
    cell[r] = sector[t]!
  }
  const places = { position: Int32Array.from(at), chain: day }
  const layout = dayCells(day, cell, { days: question.days, cells: SECTORS })

  const even = new Float64Array(n).fill(1)
  const first = plainFit([x, y, ...z], cell, even)
  const rowSd = sdByUnrest(first.residual, at, question.unrest)
  const { series, freeX, residual } = plainFit([x, y, ...z], cell, rowSd)
  const scale = robustSd(residual)
  for (let r = 0; r < n; r++) residual[r] = Math.max(-CLIP, Math.min(CLIP, residual[r]! / scale))
  const noise = serialNoise(residual, places)
  const [whiteX, whiteY] = partialOut(whiten(series, places, noise)) as [Float64Array, Float64Array]
  const weight = new Float64Array(n).fill(1)
  let sums = dayCellSums(layout, whiteX, whiteY, weight)
  let stretch = 1
  for (let round = 0; round < ROBUST_ROUNDS; round++) {
    const s = slopeWithinCells(sums)
    const levels = cellLevels(sums, s)
    for (let r = 0; r < n; r++) residual[r] = whiteY[r]! - s * whiteX[r]! - levels[cell[r]!]!
    const sd = robustSd(residual)
    for (let r = 0; r < n; r++) {
      residual[r]! /= sd
      weight[r] = huberWeight(residual[r]!)
    }
    stretch = robustStretch(residual, whiteX, huberWeight)
    sums = dayCellSums(layout, whiteX, whiteY, weight)
  }
  if (question.otherX !== null) {
    couple(
      question.otherX,
      prepared,
      { i, at, x: divided(freeX, rowSd), spread: dot(freeX, freeX) },
      coupling,
    )
  }
  return { sums, direct: slopeWithinCells(sums), stretch, rows: n, days: new Set(day).size }
}

function meanOfOthers(all: Totals, own: Float64Array, isNeighbour: Float64Array, t: number): number {
  const counted = !Number.isNaN(isNeighbour[t]!) && !Number.isNaN(own[t]!)
  const count = all.count[t]! - (counted ? 1 : 0)
  return count > 0 ? (all.sum[t]! - (counted ? own[t]! : 0)) / count : 0
}

/** Least squares of y on x with levels and nuisance taken out, rows counted by 1 / rowSd^2; all series over rowSd. */
function plainFit(
  raw: readonly Float64Array[],
  cell: Int32Array,
  rowSd: Float64Array,
): { series: Float64Array[]; freeX: Float64Array; residual: Float64Array } {
  const series = raw.map((values) => divided(withoutCellMeans(values, cell, rowSd), rowSd))
  const [freeX, freeY] = partialOut(series) as [Float64Array, Float64Array]
  const slope = dot(freeX, freeY) / dot(freeX, freeX)
  return { series, freeX, residual: freeY.map((value, r) => value - slope * freeX[r]!) }
}

/** SD of the residuals at each row's level of unrest, from groups of rows alike in it; that of all rows where it is not known. */
function sdByUnrest(residual: Float64Array, at: readonly number[], unrest: Float64Array): Float64Array {
  const all = robustSd(residual)
  const sd = new Float64Array(residual.length).fill(all > 0 ? all : 1)
  const order = [...at.keys()]
    .filter((r) => !Number.isNaN(unrest[at[r]!]!))
    .sort((a, b) => unrest[at[a]!]! - unrest[at[b]!]!)
  const groups = Math.min(MOST_UNREST_GROUPS, Math.floor(order.length / ROWS_OF_UNREST_GROUP))
  for (let g = 0; g < groups; g++) {
    const members = order.slice(
      Math.floor((g * order.length) / groups),
      Math.floor(((g + 1) * order.length) / groups),
    )
    const own = robustSd(members.map((r) => residual[r]!))
    if (own > LEAST_SHARE_OF_SD * all) for (const r of members) sd[r] = own
  }
  return sd
}

/**
 * How much of each neighbour's coefficient is in the slope of turbine i: slope of the neighbour's share of the mean on x.
 * `x` has its levels taken out, so that those of the neighbour need not be; `spread` is the sum of its weighted squares.
 */
function couple(
  otherX: GridChannel,
  prepared: Prepared,
  one: { i: number; at: readonly number[]; x: Float64Array; spread: number },
  coupling: Float64Array,
): void {
  const { others, sum } = prepared
  const { i, at, x, spread } = one
  const k = others.length
  const share = new Float64Array(at.length)
  for (let r = 0; r < at.length; r++) {
    const t = at[r]!
    share[r] = x[r]! / (sum.count[t]! - (Number.isNaN(others[i]![t]!) ? 0 : 1))
  }
  for (let j = 0; j < k; j++) {
    if (j === i) continue
    let joint = 0
    for (let r = 0; r < at.length; r++) {
      const t = at[r]!
      const value = otherX[j]![t]!
      if (!Number.isNaN(others[j]![t]!) && !Number.isNaN(value)) joint += share[r]! * value
    }
    coupling[i * k + j] = joint / spread
  }
}

/** Takes the level of each turbine in each sector out, against the mean of all at the same time. */
function withoutLevels(values: GridChannel, sector: Int32Array, length: number): GridChannel {
  const levels = values.map(() => new Float64Array(SECTORS))
  const mean = new Float64Array(length)
  for (let round = 0; round < LEVEL_ROUNDS; round++) {
    for (let t = 0; t < length; t++) {
      let sum = 0
      let count = 0
      for (let i = 0; i < values.length; i++) {
        const value = values[i]![t]!
        if (sector[t]! < 0 || Number.isNaN(value)) continue
        sum += value - levels[i]![sector[t]!]!
        count++
      }
      mean[t] = count > 1 ? sum / count : NaN
    }
    values.forEach((series, i) => {
      levels[i] = sectorMeans(series, mean, sector)
    })
  }
  return values.map((series, i) =>
    series.map((value, t) => (sector[t]! < 0 ? NaN : value - levels[i]![sector[t]!]!)),
  )
}

/** Takes the level of each own series in each sector out, against the mean of the neighbours' series. */
function levelledAgainst(own: GridChannel, others: GridChannel, sector: Int32Array): GridChannel {
  const mean = sector.map(() => 0)
  const centre = Float64Array.from(mean, (_, t) => {
    let sum = 0
    let count = 0
    for (const series of others) {
      if (Number.isNaN(series[t]!)) continue
      sum += series[t]!
      count++
    }
    return count > 0 ? sum / count : NaN
  })
  return own.map((series) => {
    const levels = sectorMeans(series, centre, sector)
    return series.map((value, t) => (sector[t]! < 0 ? NaN : value - levels[sector[t]!]!))
  })
}

function sectorMeans(
  series: Float64Array,
  mean: Float64Array,
  sector: Int32Array,
): Float64Array<ArrayBuffer> {
  const sum = new Float64Array(SECTORS)
  const count = new Float64Array(SECTORS)
  for (let t = 0; t < series.length; t++) {
    const difference = series[t]! - mean[t]!
    if (Number.isNaN(difference) || sector[t]! < 0) continue
    sum[sector[t]!]! += difference
    count[sector[t]!]!++
  }
  return sum.map((value, s) => (count[s]! > 0 ? value / count[s]! : 0))
}

function withoutCellMeans(values: Float64Array, cell: Int32Array, rowSd: Float64Array): Float64Array {
  const sum = new Float64Array(SECTORS)
  const count = new Float64Array(SECTORS)
  for (let r = 0; r < values.length; r++) {
    const weight = 1 / (rowSd[r]! * rowSd[r]!)
    sum[cell[r]!]! += weight * values[r]!
    count[cell[r]!]! += weight
  }
  return values.map((value, r) => value - sum[cell[r]!]! / count[cell[r]!]!)
}

function divided(values: Float64Array, by: Float64Array): Float64Array {
  return values.map((value, r) => value / by[r]!)
}

/** Series 0 and 1, each minus its projection on the ones behind. */
function partialOut(series: readonly Float64Array[]): Float64Array[] {
  const basis: Float64Array[] = []
  for (const nuisance of series.slice(2)) {
    let vector = nuisance
    for (const other of basis) vector = minusProjection(vector, other)
    if (dot(vector, vector) > 1e-12 * vector.length) basis.push(vector)
  }
  return series
    .slice(0, 2)
    .map((values) => basis.reduce((left, vector) => minusProjection(left, vector), values))
}

function minusProjection(values: Float64Array, on: Float64Array): Float64Array<ArrayBuffer> {
  const factor = dot(values, on) / dot(on, on)
  const left = new Float64Array(values.length)
  for (let r = 0; r < values.length; r++) left[r] = values[r]! - factor * on[r]!
  return left
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let r = 0; r < a.length; r++) sum += a[r]! * b[r]!
  return sum
}

/** Solves direct_i = c_i - sum_j coupling_ij c_j by iteration; the coupling is small, so a few rounds do. */
function solveCoupled(
  direct: ArrayLike<number>,
  coupling: Float64Array,
  slopes: readonly (NeighbourSlope | null)[],
): Float64Array {
  const k = slopes.length
  const solved = Float64Array.from(direct)
  const known = slopes.map((slope) => slope !== null)
  for (let round = 0; round < 60; round++) {
    let moved = 0
    for (let i = 0; i < k; i++) {
      if (!known[i]) continue
      let value = direct[i]!
      for (let j = 0; j < k; j++) if (known[j]) value += coupling[i * k + j]! * solved[j]!
      moved = Math.max(moved, Math.abs(value - solved[i]!))
      solved[i] = value
    }
    if (moved < 1e-12) break
  }
  return solved
}
