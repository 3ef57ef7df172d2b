import { circularMean, circularMedian, RAD_PER_DEG, wrap180, wrap360 } from '../../kernel/angle/index.ts'
import { onGrid, type FarmGrid, type GridChannel } from './farm-grid.ts'

/** Rows of a day from which a turbine's constant is taken; with fewer, the day has no local direction. */
const MIN_ROWS_PER_DAY = 18
const ROUNDS = 2

/** Wind direction of a farm without trusting any nacelle's north. */
export interface FarmDirection {
  /**
   * Consensus direction of each interval, degrees, [0, 360), off the true one by a constant of the farm; NaN = unknown.
   * Good for sectors, not for bearings.
   */
  readonly consensusDeg: Float64Array
  /** Local direction minus the consensus, the turbine's own constant of the day removed; degrees. */
  readonly localDeg: GridChannel
  /** Constant of each turbine over the window: indicated direction minus consensus, degrees, [-180, 180). */
  readonly constantDeg: Float64Array
}

/**
 * Each turbine indicates N + v, off by a constant of its own (north offset minus vane offset). The consensus is the mean
 * over turbines after these constants are taken out; they are medians, so that one bad turbine does not turn the farm.
 * The constant of the farm is set so that the median turbine has none.
 *
 * @param indicated  N + v of each turbine where it is to be heard, [i][t]; default: wherever it is known.
 */
export function farmDirection(
  grid: FarmGrid,
  indicated: GridChannel = onGrid(grid, (turbine, row) => turbine.indicatedDirection[row]!),
): FarmDirection {
  const k = indicated.length
  const known = indicated.map((values) => values.reduce((n, value) => n + (Number.isNaN(value) ? 0 : 1), 0))
  const first = known.indexOf(Math.max(...known))
  const constant = Float64Array.from(indicated, (values) =>
    medianDifference(values, indicated[first] ?? new Float64Array(0)),
  )
  let consensus = meanDirection(indicated, constant, grid.length)
  for (let round = 0; round < ROUNDS; round++) {
    for (let i = 0; i < k; i++) constant[i] = medianDifference(indicated[i]!, consensus)
    consensus = meanDirection(indicated, constant, grid.length)
  }
  const centre = circularMedian(constant)
  const shift = Number.isNaN(centre) ? 0 : centre
  return {
    consensusDeg: consensus.map((value) => wrap360(value + shift)),
    constantDeg: constant.map((value) => wrap180(value - shift)),
    localDeg: indicated.map((values) => localDirection(values, consensus, grid)),
  }
}

function medianDifference(values: Float64Array, reference: Float64Array): number {
  const differences: number[] = []
  for (let t = 0; t < values.length; t++) {
    const difference = values[t]! - reference[t]!
    if (!Number.isNaN(difference)) differences.push(wrap180(difference))
  }
  return differences.length === 0 ? NaN : wrap180(circularMedian(differences))
}

function meanDirection(
  indicated: GridChannel,
  constant: Float64Array,
  length: number,
): Float64Array<ArrayBuffer> {
  const mean = new Float64Array(length).fill(NaN)
  for (let t = 0; t < length; t++) {
    let sin = 0
    let cos = 0
    for (let i = 0; i < indicated.length; i++) {
      const angle = (indicated[i]![t]! - constant[i]!) * RAD_PER_DEG
      if (Number.isNaN(angle)) continue
      sin += Math.sin(angle)
      cos += Math.cos(angle)
    }
    if (sin !== 0 || cos !== 0) mean[t] = wrap360(Math.atan2(sin, cos) / RAD_PER_DEG)
  }
  return mean
}

/** The constant is taken day by day, so that a position sensor that loses its zero spoils a day and no more. */
function localDirection(values: Float64Array, consensus: Float64Array, grid: FarmGrid): Float64Array {
  const local = new Float64Array(values.length).fill(NaN)
  for (let from = 0; from < values.length;) {
    let to = from + 1
    while (to < values.length && grid.day[to] === grid.day[from]) to++
    const differences: number[] = []
    for (let t = from; t < to; t++) {
      local[t] = wrap180(values[t]! - consensus[t]!)
      if (!Number.isNaN(local[t]!)) differences.push(local[t]!)
    }
    const own = differences.length >= MIN_ROWS_PER_DAY ? circularMean(differences).direction : NaN
    for (let t = from; t < to; t++) local[t] = wrap180(local[t]! - own)
    from = to
  }
  return local
}
