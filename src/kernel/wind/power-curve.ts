import { InputError } from '../../errors.ts'
import { huberLocation } from './huber-location.ts'
import { hermiteValue, monotoneTangents } from './monotone-cubic.ts'
import { steepnessTable, type SteepnessTable } from './steepness.ts'

/** No wind speed lies above this; such a reading is a fault and would only make the table of bins long. */
const FASTEST_MS = 100
/** Rounds of taking the curve out of a bin's rows; after the third the points move by less than 0.02 %. */
const ROUNDS = 3
/** Pooling ends at the first bin with this share of the highest bin's power. */
const KNEE_SHARE = 0.95
/** A fall between neighbours by more than this many standard errors is kept as a true dip. */
const CLEAR_FALL = 2

export interface CurveOptions {
  /** Width of a bin, m/s, > 0.01. Default 0.5; the centres are multiples of it. */
  binWidthMs?: number
  /** Rows that a bin must have, >= 1. Default 3. */
  minimumCount?: number
}

/** All arrays have one entry per bin that has enough rows, in rising order of speed. */
export interface MeasuredCurve {
  binWidthMs: number
  /** Number of each bin: its centre is bin number x bin width. */
  bins: Int32Array
  /** Mean speed of the bin's rows, m/s. */
  speedsMs: Float64Array
  /** Robust power at that speed, kW, before pooling. */
  powersKw: Float64Array
  /** Standard error of that power, kW, rows taken as independent. */
  standardErrorsKw: Float64Array
  /** Rows in the bin. */
  counts: Float64Array
  /** Power that the curve passes through, kW: after pooling. */
  fittedKw: Float64Array
  /** Slope of the curve at each point, kW per m/s. */
  slopes: Float64Array
  steepness: SteepnessTable
  /** Rows that went into a point. */
  rows: number
  /** Rows with both values whose bin had too few rows. */
  rowsInThinBins: number
}

/**
 * Power curve of a turbine from its rows, by the method of bins.
 *
 * - Bins are [centre - w/2, centre + w/2), centred on multiples of w.
 * - A bin's power is Huber's M-estimate (k 1.345, scale from the median absolute deviation) of the rows' powers after the
 *   curve's own rise and bend inside the bin has been taken out, given at the mean speed of the rows. Both sides are
 *   weighted alike and no row is deleted, so that low rows do not vanish; convexity does not lift the points.
 * - Up to the knee (the first bin with 95 % of the highest bin's power) neighbours that fall by no more than 2 standard errors
 *   are pooled, weighted by their counts. A clearer fall is a dip the data show, and is kept, as is everything above the knee.
 * - Between points: a monotone cubic.
 *
 * @param speedsMs  m/s; length n. A row with a NaN, infinite or negative value, or above 100 m/s, is skipped.
 * @param powersKw  kW; length n; may be negative (own consumption). A row with NaN or infinity is skipped.
 * @returns a curve without points when no bin has enough rows.
 * @throws InputError LENGTH_MISMATCH; OUT_OF_RANGE for a bin width not above 0.01 or a minimum count below 1.
 */
export function measuredPowerCurve(
  speedsMs: ArrayLike<number>,
  powersKw: ArrayLike<number>,
  { binWidthMs = 0.5, minimumCount = 3 }: CurveOptions = {},
): MeasuredCurve {
  if (powersKw.length !== speedsMs.length) {
    throw new InputError(
      'LENGTH_MISMATCH',
      `powersKw: expected ${speedsMs.length} values, got ${powersKw.length}`,
    )
  }
  if (!(binWidthMs > 0.01)) {
    throw new InputError('OUT_OF_RANGE', `binWidthMs: expected above 0.01, got ${binWidthMs}`)
  }
  if (!(minimumCount >= 1)) {
    throw new InputError('OUT_OF_RANGE', `minimumCount: expected >= 1, got ${minimumCount}`)
  }
  const rows = rowsByBin(speedsMs, powersKw, binWidthMs, minimumCount)
  const { bins, starts, speeds, powers } = rows
  const n = bins.length
  const points = new Float64Array(n)
  const counts = new Float64Array(n)
  for (let b = 0; b < n; b++) {
    const from = starts[b]!
    const to = starts[b + 1]!
    let sum = 0
    for (let i = from; i < to; i++) sum += speeds[i]!
    points[b] = sum / (to - from)
    counts[b] = to - from
  }
  const located = new Float64Array(n)
  const errors = new Float64Array(n)
  const slopes = new Float64Array(n)
  const rest = new Float64Array(speeds.length)
  for (let round = 0; round < ROUNDS; round++) {
    // `located` and `slopes` hold the last round's curve; in the first both are 0, and the rest is the power itself.
    for (let b = 0; b < n; b++) {
      for (let i = starts[b]!; i < starts[b + 1]!; i++) {
        rest[i] = powers[i]! - (round === 0 ? 0 : nearPoint(points, located, slopes, b, speeds[i]!))
      }
    }
    for (let b = 0; b < n; b++) {
      rest.subarray(starts[b], starts[b + 1]).sort()
      const { location, standardError } = huberLocation(rest, starts[b]!, starts[b + 1]!)
      located[b] = located[b]! + location
      errors[b] = standardError
    }
    monotoneTangents(points, located, n, slopes)
  }
  const fittedKw = pooled(located, errors, counts)
  monotoneTangents(points, fittedKw, n, slopes)
  return {
    binWidthMs,
    bins,
    speedsMs: points,
    powersKw: located,
    standardErrorsKw: errors,
    counts,
    fittedKw,
    slopes,
    steepness: steepnessTable(points, located, counts, binWidthMs),
    rows: speeds.length,
    rowsInThinBins: rows.thin,
  }
}

/**
 * Power of the curve at a speed.
 *
 * @returns kW. NaN outside the first to last point, each widened by half a bin (there the curve goes on straight): the
 *   curve knows nothing of what lies beyond and is not held constant. NaN too more than half a bin away from the nearest
 *   point where two or more bins in a row are missing; a single missing bin is bridged.
 */
export function powerAt(curve: MeasuredCurve, speedMs: number): number {
  const { speedsMs, fittedKw, slopes, binWidthMs, bins } = curve
  const n = speedsMs.length
  const half = binWidthMs / 2
  if (n === 0 || !(speedMs >= speedsMs[0]! - half && speedMs <= speedsMs[n - 1]! + half)) return NaN
  // The last point at or below the speed, -1 before the first. The point of the speed's own bin stands at this place or, where
  // bins are missing, before it.
  let i = Math.min(Math.floor(speedMs / binWidthMs + 0.5) - bins[0]!, n - 1)
  while (i >= 0 && speedsMs[i]! > speedMs) i--
  if (i < 0) return fittedKw[0]! + (speedMs - speedsMs[0]!) * slopes[0]!
  if (i === n - 1) return fittedKw[i]! + (speedMs - speedsMs[i]!) * slopes[i]!
  if (bins[i + 1]! - bins[i]! > 2 && speedMs > speedsMs[i]! + half && speedMs < speedsMs[i + 1]! - half)
    return NaN
  return hermiteValue(speedsMs, fittedKw, slopes, i, speedMs)
}

/** The curve at a speed inside bin b, which lies between its neighbours' points; straight on beyond the ends. */
function nearPoint(xs: Float64Array, ys: Float64Array, slopes: Float64Array, b: number, x: number): number {
  const i = x < xs[b]! ? b - 1 : b
  if (i < 0 || i + 1 >= xs.length) return ys[b]! + (x - xs[b]!) * slopes[b]!
  return hermiteValue(xs, ys, slopes, i, x)
}

interface BinnedRows {
  bins: Int32Array
  /** Rows of bin b are starts[b] to starts[b + 1] of speeds and powers. */
  starts: Int32Array
  speeds: Float64Array
  powers: Float64Array
  thin: number
}

function rowsByBin(
  speedsMs: ArrayLike<number>,
  powersKw: ArrayLike<number>,
  binWidthMs: number,
  minimumCount: number,
): BinnedRows {
  const n = speedsMs.length
  const binOfRow = new Int32Array(n).fill(-1)
  const perBin = new Int32Array(Math.floor(FASTEST_MS / binWidthMs + 0.5) + 1)
  for (let i = 0; i < n; i++) {
    const speed = speedsMs[i]!
    if (!(speed >= 0 && speed <= FASTEST_MS && Number.isFinite(powersKw[i]))) continue
    const bin = Math.floor(speed / binWidthMs + 0.5)
    binOfRow[i] = bin
    perBin[bin]!++
  }
  const kept: number[] = []
  const starts = [0]
  const next = new Int32Array(perBin.length).fill(-1)
  let total = 0
  let thin = 0
  for (let bin = 0; bin < perBin.length; bin++) {
    const count = perBin[bin]!
    if (count < minimumCount) thin += count
    if (count === 0 || count < minimumCount) continue
    next[bin] = total
    total += count
    kept.push(bin)
    starts.push(total)
  }
  const speeds = new Float64Array(total)
  const powers = new Float64Array(total)
  for (let i = 0; i < n; i++) {
    const bin = binOfRow[i]!
    if (bin < 0 || next[bin]! < 0) continue
    const slot = next[bin]!++
    speeds[slot] = speedsMs[i]!
    powers[slot] = powersKw[i]!
  }
  return { bins: Int32Array.from(kept), starts: Int32Array.from(starts), speeds, powers, thin }
}

/** Pools neighbours that fall by no more than their errors explain, up to the knee (pool adjacent violators). */
function pooled(powersKw: Float64Array, errors: Float64Array, counts: Float64Array): Float64Array {
  const fitted = Float64Array.from(powersKw)
  let highest = -Infinity
  for (const power of powersKw) highest = Math.max(highest, power)
  const knee = powersKw.findIndex((power) => power >= KNEE_SHARE * highest)
  const blocks: { value: number; weight: number; variance: number; from: number; to: number }[] = []
  for (let i = 0; i <= knee; i++) {
    let block = { value: powersKw[i]!, weight: counts[i]!, variance: errors[i]! ** 2, from: i, to: i + 1 }
    for (let last = blocks.at(-1); last !== undefined; last = blocks.at(-1)) {
      const fall = last.value - block.value
      if (!(fall > 0 && fall <= CLEAR_FALL * Math.sqrt(last.variance + block.variance))) break
      blocks.pop()
      const weight = last.weight + block.weight
      block = {
        value: (last.value * last.weight + block.value * block.weight) / weight,
        weight,
        variance: (last.variance * last.weight ** 2 + block.variance * block.weight ** 2) / weight ** 2,
        from: last.from,
        to: block.to,
      }
    }
    blocks.push(block)
  }
  for (const { value, from, to } of blocks) fitted.fill(value, from, to)
  return fitted
}
