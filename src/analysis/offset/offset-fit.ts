import { RAD_PER_DEG } from '../../kernel/angle/index.ts'
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
} from '../../kernel/stats/index.ts'
import type { OffsetRows } from './offset-rows.ts'

const MAX_ITERATIONS = 40
/** Of the offset, radians: less than a thousandth of a degree, far below what any log can tell. */
const CONVERGED_RAD = 1e-5
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
  /** What the sums are made of, per row: levels of all rows taken out, over the scatter, filtered. */
  readonly whiteX: Float64Array
  readonly whiteY: Float64Array
  /** Resampled slopes times this are deviations of d as robust weights let it spread. */
  readonly stretch: number
  /** Change of d per unit of anemometer response (relative change of wind speed per degree of vane), radians. */
  readonly perResponse: number
  readonly noise: OffsetNoise
  /** Robust weights of the rows; length n. */
  readonly weight: Float64Array
}

/**
 * Generalised least squares for d in  ln P = level(group) + ln P(u cos(v + d)^(p/3)) + noise,  with the local steepness
 * s of the measured curve: the yaw term is s (p/3) ln cos(v + d).
 *
 * Bands of wind speed count by the inverse of their scatter. The error of an anemometer against the rotor's mean wind
 * lasts for tens of minutes, the vane does not: what the rows before foretell of the noise is taken out first. Outliers
 * lose weight only by what is left after the yaw term.
 *
 * @source Gauss-Newton on the model above; weights by Huber (1964) and Beaton & Tukey (1974).
 */
export function fitOffset(rows: OffsetRows, model: OffsetModel): OffsetFit {
  const n = rows.vane.length
  const terms = yawTerms(rows)
  let noise: OffsetNoise = {
    scale: new Float64Array(n).fill(1),
    scatter: NaN,
    serial: { share: 0, persistence: 0 },
  }
  let offset = 0
  const weight = new Float64Array(n).fill(1)
  let converged = false
  let stretch = 1
  let last: NewtonStep | undefined
  const biweightFrom = SETTLING_ITERATIONS + HUBER_ITERATIONS

  for (let iteration = 0; iteration < MAX_ITERATIONS && !converged; iteration++) {
    const step = newtonStep(rows, model, terms, { offset, noise, weight })
    last = step
    if (Number.isNaN(step.slope)) break
    offset = clamp(offset + step.slope, MAX_YAW_ERROR_RAD)
    if (iteration < SETTLING_ITERATIONS) {
      noise = measureNoise(rows, step.levelX, step.levelY, step.slope, noise.scale)
      continue
    }
    const weightOf = iteration < biweightFrom ? huberWeight : biweight
    const standardised = standardisedResiduals(rows, step)
    for (let i = 0; i < n; i++) weight[i] = standardised ? weightOf(standardised[i]!) : 1
    converged = iteration > biweightFrom && Math.abs(step.slope) < CONVERGED_RAD
    if (converged && standardised) stretch = robustStretch(standardised, step.whiteX, weightOf)
  }
  return {
    offset: converged ? offset : NaN,
    converged,
    sums: last?.sums ?? dayCellSums(terms.layout, terms.x, terms.y, weight),
    whiteX: last?.whiteX ?? terms.x,
    whiteY: last?.whiteY ?? terms.y,
    stretch,
    perResponse: perResponseOf(rows, terms, noise, weight),
    noise,
    weight,
  }
}

/**
 * The offset at another exponent, with the noise and the weights of an earlier fit to the same rows.
 *
 * @returns d, radians, as `OffsetFit.offset`; NaN when it does not settle.
 */
export function offsetAtExponent(
  rows: OffsetRows,
  exponent: number,
  fit: OffsetFit,
  fittedExponent: number,
): number {
  const terms = yawTerms(rows)
  let offset = clamp((fit.offset * fittedExponent) / exponent, MAX_YAW_ERROR_RAD)
  for (let iteration = 0; iteration < MAX_ITERATIONS; iteration++) {
    const { slope } = newtonStep(rows, { exponent, responsePerDeg: 0 }, terms, {
      offset,
      noise: fit.noise,
      weight: fit.weight,
    })
    if (Number.isNaN(slope)) return NaN
    offset = clamp(offset + slope, MAX_YAW_ERROR_RAD)
    if (Math.abs(slope) < CONVERGED_RAD) return offset
  }
  return NaN
}

/** Row by row values as a fit looks at them: levels taken out, over the scatter, filtered by the noise's memory. */
export function asFitted(
  rows: OffsetRows,
  fit: Pick<OffsetFit, 'noise' | 'weight'>,
  values: readonly Float64Array[],
): Float64Array[] {
  const levelled = values.map((one) => withoutLevels(rows, one, fit.noise.scale, fit.weight))
  return whiten(levelled, rows, fit.noise.serial)
}

/** Arrays that every iteration fills anew, and what does not change. */
interface YawTerms {
  readonly layout: DayCells
  readonly x: Float64Array
  readonly y: Float64Array
  /** Effect on ln P of a response of 1 per degree. */
  readonly bySpeed: Float64Array
}

function yawTerms(rows: OffsetRows): YawTerms {
  const n = rows.vane.length
  const bySpeed = new Float64Array(n)
  for (let i = 0; i < n; i++) bySpeed[i] = rows.steepness[i]! * (rows.vane[i]! / RAD_PER_DEG)
  return {
    layout: dayCells(rows.day, rows.cell, rows),
    x: new Float64Array(n),
    y: new Float64Array(n),
    bySpeed,
  }
}

interface NewtonStep {
  /** Change of d, radians; NaN where the vane does not vary inside any group. */
  readonly slope: number
  readonly sums: DayCellSums
  readonly levelX: Float64Array
  readonly levelY: Float64Array
  readonly whiteX: Float64Array
  readonly whiteY: Float64Array
}

function newtonStep(
  rows: OffsetRows,
  model: OffsetModel,
  terms: YawTerms,
  state: { offset: number; noise: OffsetNoise; weight: Float64Array },
): NewtonStep {
  const { noise, weight } = state
  fillYawTerm(rows, model, state.offset, terms.bySpeed, terms.x, terms.y)
  const levelX = withoutLevels(rows, terms.x, noise.scale, weight)
  const levelY = withoutLevels(rows, terms.y, noise.scale, weight)
  const [whiteX, whiteY] = whiten([levelX, levelY], rows, noise.serial) as [Float64Array, Float64Array]
  const sums = dayCellSums(terms.layout, whiteX, whiteY, weight)
  return { slope: slopeWithinCells(sums), sums, levelX, levelY, whiteX, whiteY }
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
function perResponseOf(rows: OffsetRows, terms: YawTerms, noise: OffsetNoise, weight: Float64Array): number {
  const [whiteX, whiteBySpeed] = asFitted(rows, { noise, weight }, [terms.x, terms.bySpeed]) as [
    Float64Array,
    Float64Array,
  ]
  return slopeWithinCells(dayCellSums(terms.layout, whiteX, whiteBySpeed, weight))
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

/** Residuals after the step over their robust SD; null where they have none. */
function standardisedResiduals(rows: OffsetRows, step: NewtonStep): Float64Array | null {
  const level = cellLevels(step.sums, step.slope)
  const residual = new Float64Array(step.whiteX.length)
  for (let i = 0; i < residual.length; i++) {
    residual[i] = step.whiteY[i]! - step.slope * step.whiteX[i]! - level[rows.cell[i]!]!
  }
  const sd = robustSd(residual)
  if (!(sd > 0)) return null
  for (let i = 0; i < residual.length; i++) residual[i]! /= sd
  return residual
}

function clamp(value: number, most: number): number {
  return Math.max(-most, Math.min(most, value))
}
