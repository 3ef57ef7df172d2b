import { RAD_PER_DEG } from '../kernel/angle/index.ts'
import {
  biweight,
  cellLevels,
  dayCells,
  dayCellSums,
  huberWeight,
  robustSd,
  robustStretch,
  serialNoise,
  slopeWithinCells,
  whiten,
  type DayCells,
  type DayCellSums,
  type SerialNoise,
} from '../kernel/stats/index.ts'
import type { OffsetRows } from './offset-rows.ts'

const MAX_ITERATIONS = 40
/** Of the offset, radians: a ten-thousandth of a degree, far below what any log can tell. */
const CONVERGED_RAD = 2e-6
/** Iterations in which the scatter of the bands and the memory of the noise are measured. */
const SETTLING_ITERATIONS = 3
/** Iterations with Huber's weights before the biweight, which needs a good start, takes over. */
const HUBER_ITERATIONS = 2
/** Residuals beyond so many standard deviations count as that many for the memory of the noise. */
const CLIP = 3
/** Rows below which a wind-speed band takes the scatter of all bands. */
const MIN_ROWS_FOR_SCATTER = 30
/** Beyond this yaw error the cosine law is no longer trusted and its logarithm runs away, radians. */
const MAX_YAW_ERROR_RAD = 60 * RAD_PER_DEG

export interface OffsetModel {
  /** p. */
  readonly exponent: number
  /** a: the anemometer reads u (1 + a v) with v in degrees of vane; taken as known. */
  readonly responsePerDeg: number
}

/** What is known of the noise of ln P: it does not depend on the exponent. */
export interface OffsetNoise {
  /** SD of ln P row by row: that of the band of wind speed. */
  readonly scale: Float64Array
  /** Robust SD over all rows. */
  readonly scatter: number
  readonly serial: SerialNoise
}

export interface OffsetFit {
  /** d, radians; NaN where the vane does not vary inside any group. */
  readonly offset: number
  readonly converged: boolean
  /** Sums at the end: their slope is the last step of d, so resampled slopes are deviations of d. */
  readonly sums: DayCellSums
  /** Resampled slopes times this are deviations of d as robust weights let it spread. */
  readonly stretch: number
  /** Change of d per unit of anemometer response (relative change of wind speed per degree of vane), radians. */
  readonly perResponse: number
  readonly noise: OffsetNoise
}

/**
 * Generalised least squares for d in  ln P = level(group) + ln P(u cos(v + d)^(p/3)) + noise,  with the local steepness
 * s of the measured curve: the yaw term is s (p/3) ln cos(v + d).
 *
 * Bands of wind speed count by the inverse of their scatter. The error of an anemometer against the rotor's mean wind
 * lasts for tens of minutes, the vane does not: what the rows before foretell of the noise is taken out first. Outliers
 * lose weight only by what is left after the yaw term.
 *
 * @param known  start value and noise of an earlier fit to the same rows; without it both are worked out.
 * @source Gauss-Newton on the model above; weights by Huber (1964) and Beaton & Tukey (1974).
 */
export function fitOffset(
  rows: OffsetRows,
  model: OffsetModel,
  known?: { offset: number; noise: OffsetNoise },
): OffsetFit {
  const n = rows.vane.length
  const layout = dayCells(rows.day, rows.cell, rows)
  const x = new Float64Array(n)
  const y = new Float64Array(n)
  const bySpeed = new Float64Array(n)
  for (let i = 0; i < n; i++) bySpeed[i] = rows.steepness[i]! * (rows.vane[i]! / RAD_PER_DEG)
  let noise = known?.noise ?? {
    scale: new Float64Array(n).fill(1),
    scatter: NaN,
    serial: { share: 0, persistence: 0 },
  }
  let offset = known?.offset ?? 0
  let weight = new Float64Array(n).fill(1)
  let sums = dayCellSums(layout, x, y, weight)
  let converged = false
  let stretch = 1

  const first = known ? SETTLING_ITERATIONS : 0
  for (let iteration = first; iteration < MAX_ITERATIONS && !converged; iteration++) {
    fillYawTerm(rows, model, offset, bySpeed, x, y)
    const levelX = withoutLevels(rows, x, noise.scale, weight)
    const levelY = withoutLevels(rows, y, noise.scale, weight)
    const [whiteX, whiteY] = whiten([levelX, levelY], rows, noise.serial) as [Float64Array, Float64Array]
    sums = dayCellSums(layout, whiteX, whiteY, weight)
    const step = slopeWithinCells(sums)
    if (Number.isNaN(step))
      return { offset: NaN, converged: false, sums, stretch: NaN, perResponse: NaN, noise }
    offset = clamp(offset + step, MAX_YAW_ERROR_RAD)
    if (iteration < SETTLING_ITERATIONS) {
      noise = measureNoise(rows, levelX, levelY, step, noise.scale)
    } else {
      const biweightFrom = SETTLING_ITERATIONS + HUBER_ITERATIONS
      const robust = robustWeights(
        rows,
        whiteX,
        whiteY,
        step,
        sums,
        iteration < biweightFrom ? huberWeight : biweight,
      )
      weight = robust.weight
      stretch = robust.stretch
      converged = iteration > biweightFrom && Math.abs(step) < CONVERGED_RAD
    }
  }
  return {
    offset,
    converged,
    sums,
    stretch,
    perResponse: perResponseOf(rows, layout, x, bySpeed, noise, weight),
    noise,
  }
}

/** x = derivative of the yaw term by d; y = what is left of ln P with d as it stands. */
function fillYawTerm(
  rows: OffsetRows,
  model: OffsetModel,
  offset: number,
  bySpeed: Float64Array,
  x: Float64Array,
  y: Float64Array,
): void {
  const third = model.exponent / 3
  for (let i = 0; i < x.length; i++) {
    const s = rows.steepness[i]! * third
    const error = clamp(rows.vane[i]! + offset, MAX_YAW_ERROR_RAD)
    x[i] = -s * Math.tan(error)
    y[i] = rows.logRatio[i]! + model.responsePerDeg * bySpeed[i]! - s * Math.log(Math.cos(error))
  }
}

/** How d moves with the response: the same regression with the effect of a response in place of ln P. */
function perResponseOf(
  rows: OffsetRows,
  layout: DayCells,
  x: Float64Array,
  bySpeed: Float64Array,
  noise: OffsetNoise,
  weight: Float64Array,
): number {
  const levelled = [x, bySpeed].map((values) => withoutLevels(rows, values, noise.scale, weight))
  const [whiteX, whiteBySpeed] = whiten(levelled, rows, noise.serial) as [Float64Array, Float64Array]
  return slopeWithinCells(dayCellSums(layout, whiteX, whiteBySpeed, weight))
}

/** Values minus the weighted mean of their cell, over the scatter of their band. */
function withoutLevels(
  rows: OffsetRows,
  values: Float64Array,
  scale: Float64Array,
  weight: Float64Array,
): Float64Array {
  const sum = new Float64Array(rows.cells)
  const count = new Float64Array(rows.cells)
  for (let i = 0; i < values.length; i++) {
    sum[rows.cell[i]!]! += weight[i]! * values[i]!
    count[rows.cell[i]!]! += weight[i]!
  }
  const out = new Float64Array(values.length)
  for (let i = 0; i < values.length; i++) {
    const cell = rows.cell[i]!
    out[i] = count[cell]! > 0 ? (values[i]! - sum[cell]! / count[cell]!) / scale[i]! : 0
  }
  return out
}

/** Scatter by band of wind speed, and memory, of what the yaw term leaves. */
function measureNoise(
  rows: OffsetRows,
  levelX: Float64Array,
  levelY: Float64Array,
  step: number,
  oldScale: Float64Array,
): OffsetNoise {
  const n = levelX.length
  const residual = new Float64Array(n)
  const byBand = Array.from({ length: rows.bands }, (): number[] => [])
  for (let i = 0; i < n; i++) {
    residual[i] = (levelY[i]! - step * levelX[i]!) * oldScale[i]!
    byBand[rows.band[i]!]!.push(residual[i]!)
  }
  const scatter = robustSd(residual)
  const scale = new Float64Array(n).fill(1)
  // Noise-free rows all count alike, and have no memory.
  if (!(scatter > 0)) return { scale, scatter, serial: { share: 0, persistence: 0 } }
  const bandScatter = byBand.map((inBand) => {
    const sd = robustSd(inBand)
    return inBand.length >= MIN_ROWS_FOR_SCATTER && sd > 0.2 * scatter ? sd : scatter
  })
  for (let i = 0; i < n; i++) {
    scale[i] = bandScatter[rows.band[i]!]!
    residual[i] = clamp(residual[i]! / scale[i]!, CLIP)
  }
  return { scale, scatter, serial: serialNoise(residual, rows) }
}

function robustWeights(
  rows: OffsetRows,
  x: Float64Array,
  y: Float64Array,
  slope: number,
  sums: DayCellSums,
  robust: (standardised: number) => number,
): { weight: Float64Array<ArrayBuffer>; stretch: number } {
  const level = cellLevels(sums, slope)
  const weight = new Float64Array(x.length).fill(1)
  const residual = new Float64Array(x.length)
  for (let i = 0; i < x.length; i++) residual[i] = y[i]! - slope * x[i]! - level[rows.cell[i]!]!
  const sd = robustSd(residual)
  if (!(sd > 0)) return { weight, stretch: 1 }
  for (let i = 0; i < x.length; i++) {
    residual[i]! /= sd
    weight[i] = robust(residual[i]!)
  }
  return { weight, stretch: robustStretch(residual, x, robust) }
}

function clamp(value: number, most: number): number {
  return Math.max(-most, Math.min(most, value))
}
