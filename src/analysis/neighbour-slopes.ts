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
} from '../kernel/stats/index.ts'
import type { FarmGrid, GridChannel } from './farm-grid.ts'

/** Direction sectors in which a turbine has a level of its own against its neighbours, degrees. */
const SECTOR_DEG = 15
const SECTORS = 360 / SECTOR_DEG
const LEVEL_ROUNDS = 4
const ROBUST_ROUNDS = 4
const CLIP = 3
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
  const slopes: (NeighbourSlope | null)[] = []
  const coupling = new Float64Array(k * k)
  for (let i = 0; i < k; i++) slopes.push(compareOne(question, { own, others, sector }, i, coupling))
  const solve = (direct: ArrayLike<number>): Float64Array => solveCoupled(direct, coupling, slopes)
  return {
    slopes,
    solve,
    coefficient: solve(slopes.map((slope) => slope?.direct ?? NaN)),
  }
}

function compareOne(
  question: NeighbourQuestion,
  series: { own: GridChannel; others: GridChannel; sector: Int32Array },
  i: number,
  coupling: Float64Array,
): NeighbourSlope | null {
  const { grid, nuisance, otherX } = question
  const { own, others, sector } = series
  const k = grid.turbines.length
  const at: number[] = []
  for (let t = 0; t < grid.length; t++) {
    if (sector[t]! < 0 || Number.isNaN(own[i]![t]!) || Number.isNaN(question.x[i]![t]!)) continue
    let neighbours = 0
    for (let j = 0; j < k; j++) if (j !== i && !Number.isNaN(others[j]![t]!)) neighbours++
    if (neighbours === 0 || nuisance.some((values) => Number.isNaN(values[i]![t]!))) continue
    at.push(t)
  }
  const n = at.length
  if (n < MIN_ROWS) return null
  const x = new Float64Array(n)
  const y = new Float64Array(n)
  const z = nuisance.map(() => new Float64Array(n))
  const shared = otherX === null ? [] : Array.from({ length: k }, () => new Float64Array(n))
  at.forEach((t, r) => {
    let sum = 0
    let count = 0
    const zSum = new Float64Array(nuisance.length)
    const zCount = new Float64Array(nuisance.length)
    for (let j = 0; j < k; j++) {
      if (j === i || Number.isNaN(others[j]![t]!)) continue
      sum += others[j]![t]!
      count++
      nuisance.forEach((values, l) => {
        const value = values[j]![t]!
        if (Number.isNaN(value)) return
        zSum[l]! += value
        zCount[l]!++
      })
    }
    x[r] = question.x[i]![t]!
    y[r] = own[i]![t]! - sum / count
    nuisance.forEach((values, l) => {
      z[l]![r] = values[i]![t]! - (zCount[l]! > 0 ? zSum[l]! / zCount[l]! : 0)
    })
    if (otherX === null) return
    for (let j = 0; j < k; j++) {
      if (j !== i && !Number.isNaN(others[j]![t]!)) shared[j]![r] = (otherX[j]![t]! || 0) / count
    }
  })
  const day = Int32Array.from(at, (t) => grid.day[t]!)
  const cell = Int32Array.from(at, (t) => sector[t]!)
  const places = { position: Int32Array.from(at), chain: day }
  const layout = dayCells(day, cell, { days: question.days, cells: SECTORS })

  const level = (values: Float64Array): Float64Array => demeaned(values, cell, SECTORS)
  const raw = [x, y, ...z, ...shared].map(level)
  const first = partialOut(raw, z.length)
  const slope = slopeOf(first[0]!, first[1]!)
  const residual = first[1]!.map((value, r) => value - slope * first[0]![r]!)
  const scale = robustSd(residual)
  const noise = serialNoise(
    residual.map((value) => Math.max(-CLIP, Math.min(CLIP, value / scale))),
    places,
  )
  const white = partialOut(whiten(raw, places, noise), z.length)
  let weight = new Float64Array(n).fill(1)
  let sums = dayCellSums(layout, white[0]!, white[1]!, weight)
  let stretch = 1
  for (let round = 0; round < ROBUST_ROUNDS; round++) {
    const s = slopeWithinCells(sums)
    const levels = cellLevels(sums, s)
    const left = white[1]!.map((value, r) => value - s * white[0]![r]! - levels[cell[r]!]!)
    const sd = robustSd(left)
    const standardised = left.map((value) => value / sd)
    weight = standardised.map((value) => huberWeight(value))
    stretch = robustStretch(standardised, white[0]!, huberWeight)
    sums = dayCellSums(layout, white[0]!, white[1]!, weight)
  }
  shared.forEach((_, j) => {
    if (j === i) return
    coupling[i * k + j] = slopeWithinCells(dayCellSums(layout, white[0]!, white[2 + j]!, weight))
  })
  return { sums, direct: slopeWithinCells(sums), stretch, rows: n, days: new Set(day).size }
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

function demeaned(values: Float64Array, cell: Int32Array, cells: number): Float64Array {
  const sum = new Float64Array(cells)
  const count = new Float64Array(cells)
  for (let r = 0; r < values.length; r++) {
    sum[cell[r]!]! += values[r]!
    count[cell[r]!]!++
  }
  return values.map((value, r) => value - sum[cell[r]!]! / count[cell[r]!]!)
}

/** Series 0, 1 and those behind the `nuisance` ones, each minus its projection on the nuisance ones (at 2 to 2 + nuisance - 1). */
function partialOut(series: readonly Float64Array[], nuisance: number): Float64Array[] {
  const basis: Float64Array[] = []
  for (let l = 0; l < nuisance; l++) {
    let vector = series[2 + l]!.slice()
    for (const other of basis) vector = minusProjection(vector, other)
    if (dot(vector, vector) > 1e-12 * vector.length) basis.push(vector)
  }
  return series
    .filter((_, s) => s < 2 || s >= 2 + nuisance)
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

function slopeOf(x: Float64Array, y: Float64Array): number {
  return dot(x, y) / dot(x, x)
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
