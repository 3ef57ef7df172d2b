import { powerAt, steepnessAt } from '../kernel/wind/index.ts'
import {
  biweight,
  dayCellSums,
  huberWeight,
  robustSd,
  slopeWithinCells,
  type DayCellSums,
} from '../kernel/stats/index.ts'
import type { TurbineFrame } from '../frame/index.ts'

const RAD_PER_DEG = Math.PI / 180
const MAX_ITERATIONS = 40
/** Of the offset, radians: far below what any log can tell. */
const CONVERGED_RAD = 1e-7
/** Iterations with Huber's weights before the biweight, which needs a good start, takes over. */
const HUBER_ITERATIONS = 4
/** Rows below which a wind-speed band takes the scatter of all bands. */
const MIN_ROWS_FOR_SCATTER = 30
/** Beyond this yaw error the cosine law is no longer trusted and its logarithm runs away, radians. */
const MAX_YAW_ERROR_RAD = (60 * Math.PI) / 180

/** The rows of one turbine that tell its static offset. All arrays of length n. */
export interface OffsetRows {
  readonly days: number
  readonly cells: number
  readonly day: Int32Array
  /** Level group: wind speed by whole m/s, tercile of turbulence, day or night. */
  readonly cell: Int32Array
  /** Band of whole m/s, 0 = lowest. */
  readonly band: Int32Array
  readonly bands: number
  /** Vane, radians. */
  readonly vane: Float64Array
  /** d ln P / d ln u of the measured curve at the row's wind speed. */
  readonly steepness: Float64Array
  /** ln of power over the measured curve. */
  readonly logRatio: Float64Array
}

export interface OffsetFit {
  /** d, radians. */
  readonly offset: number
  readonly converged: boolean
  /** Weights of the rows at the end; length n. */
  readonly weight: Float64Array
  /** Sums at the end: their slope is the last step of d (0 when converged), so resampled slopes are deviations of d. */
  readonly sums: DayCellSums
  /** Change of d per unit of anemometer response (relative change of wind speed per degree of vane), radians. */
  readonly perResponse: number
  /** Robust SD of what remains of ln P. */
  readonly scatter: number
}

/** Picks the used rows of a frame and puts them in level groups. */
export function offsetRows(frame: TurbineFrame, days: number): OffsetRows {
  const used: number[] = []
  for (let i = 0; i < frame.time.length; i++) if (frame.reason[i] === 0) used.push(i)
  const n = used.length
  const lowest = Math.floor(frame.windMinMs)
  const band = Int32Array.from(used, (i) => Math.floor(frame.normalisedSpeed[i]!) - lowest)
  const bands = band.reduce((most, b) => Math.max(most, b + 1), 0)
  const tercile = turbulenceTerciles(
    used.map((i) => frame.turbulence[i]!),
    band,
    bands,
  )
  const curve = frame.curve
  return {
    days,
    cells: bands * 6,
    day: Int32Array.from(used, (i) => frame.day[i]!),
    cell: Int32Array.from({ length: n }, (_, k) => (band[k]! * 3 + tercile[k]!) * 2 + frame.night[used[k]!]!),
    band,
    bands,
    vane: Float64Array.from(used, (i) => frame.vane[i]! * RAD_PER_DEG),
    steepness: Float64Array.from(used, (i) => steepnessAt(curve, frame.normalisedSpeed[i]!)),
    logRatio: Float64Array.from(used, (i) =>
      Math.log(frame.power[i]! / powerAt(curve, frame.normalisedSpeed[i]!)),
    ),
  }
}

/**
 * Least squares for d in  ln P = level(group) + ln P(u cos(v + d)^(p/3)) + noise,  with the local steepness s of the
 * measured curve: the yaw term is s (p/3) ln cos(v + d). Bands of wind speed count by the inverse of their scatter;
 * outliers lose weight only by what is left after the yaw term.
 *
 * @param model.exponent  p.
 * @param model.responsePerDeg  a: the anemometer reads u (1 + a v) with v in degrees of vane; taken as known.
 * @returns offset NaN where the vane does not vary inside any group.
 * @source Gauss-Newton on the model of the design's section on the static offset; weights by Huber (1964), Beaton & Tukey (1974).
 */
export function fitOffset(rows: OffsetRows, model: { exponent: number; responsePerDeg: number }): OffsetFit {
  const n = rows.vane.length
  const third = model.exponent / 3
  const x = new Float64Array(n)
  const y = new Float64Array(n)
  const weight = new Float64Array(n).fill(1)
  let offset = 0
  let sums = dayCellSums({ day: rows.day, cell: rows.cell, x, y, weight }, rows)
  let scatter = NaN
  let converged = false

  for (let iteration = 0; iteration < MAX_ITERATIONS && !converged; iteration++) {
    for (let i = 0; i < n; i++) {
      const s = rows.steepness[i]!
      const error = Math.max(-MAX_YAW_ERROR_RAD, Math.min(MAX_YAW_ERROR_RAD, rows.vane[i]! + offset))
      const byAnemometer = s * model.responsePerDeg * (rows.vane[i]! / RAD_PER_DEG)
      x[i] = -s * third * Math.tan(error)
      y[i] = rows.logRatio[i]! + byAnemometer - s * third * Math.log(Math.cos(error))
    }
    sums = dayCellSums({ day: rows.day, cell: rows.cell, x, y, weight }, rows)
    const step = slopeWithinCells(sums)
    if (Number.isNaN(step)) return { offset: NaN, converged: false, weight, sums, perResponse: NaN, scatter }
    offset = Math.max(-MAX_YAW_ERROR_RAD, Math.min(MAX_YAW_ERROR_RAD, offset + step))
    scatter = reweigh(rows, x, y, step, sums, weight, iteration < HUBER_ITERATIONS ? huberWeight : biweight)
    converged = iteration > HUBER_ITERATIONS && Math.abs(step) < CONVERGED_RAD
  }
  const bySpeed = rows.steepness.map((s, i) => s * (rows.vane[i]! / RAD_PER_DEG))
  const perResponse = slopeWithinCells(
    dayCellSums({ day: rows.day, cell: rows.cell, x, y: bySpeed, weight }, rows),
  )
  return { offset, converged, weight, sums, perResponse, scatter }
}

/** New weights from the residuals, in place: inverse variance of the band times the robust weight. Returns the scatter of all. */
function reweigh(
  rows: OffsetRows,
  x: Float64Array,
  y: Float64Array,
  slope: number,
  sums: DayCellSums,
  weight: Float64Array,
  robust: (standardised: number) => number,
): number {
  const n = x.length
  const level = cellLevels(sums, slope)
  const residual = new Float64Array(n)
  for (let i = 0; i < n; i++) residual[i] = y[i]! - slope * x[i]! - level[rows.cell[i]!]!
  const overall = robustSd(residual)
  if (!(overall > 0)) return overall // noise-free: every weight stays as it is
  const byBand = Array.from({ length: rows.bands }, (_, b) => {
    const inBand = residual.filter((_, i) => rows.band[i] === b)
    const sd = robustSd(inBand)
    return inBand.length >= MIN_ROWS_FOR_SCATTER && sd > 0.2 * overall ? sd : overall
  })
  for (let i = 0; i < n; i++) {
    const sd = byBand[rows.band[i]!]!
    weight[i] = (robust(residual[i]! / sd) * (overall * overall)) / (sd * sd)
  }
  return overall
}

function cellLevels(sums: DayCellSums, slope: number): Float64Array {
  const level = new Float64Array(sums.cells)
  for (let c = 0; c < sums.cells; c++) {
    let w = 0
    let remainder = 0
    for (let k = sums.cellStart[c]!; k < sums.cellStart[c + 1]!; k++) {
      w += sums.w[k]!
      remainder += sums.wy[k]! - slope * sums.wx[k]!
    }
    level[c] = w > 0 ? remainder / w : 0
  }
  return level
}

/** 0, 1, 2 by turbulence inside each band; all 0 where no SD of the wind speed is logged, 1 where a single value is missing. */
function turbulenceTerciles(turbulence: readonly number[], band: Int32Array, bands: number): Uint8Array {
  const tercile = new Uint8Array(turbulence.length)
  for (let b = 0; b < bands; b++) {
    const known = turbulence.filter((value, k) => band[k] === b && !Number.isNaN(value)).sort((p, q) => p - q)
    if (known.length === 0) continue
    const low = known[Math.floor(known.length / 3)]!
    const high = known[Math.floor((2 * known.length) / 3)]!
    for (let k = 0; k < turbulence.length; k++) {
      if (band[k] !== b) continue
      const value = turbulence[k]!
      tercile[k] = Number.isNaN(value) ? 1 : value < low ? 0 : value < high ? 1 : 2
    }
  }
  return tercile
}
