import { DEG_PER_RAD, RAD_PER_DEG } from '../../kernel/angle/index.ts'
import { huberWeight, robustSd, robustStretch, type DayWeights } from '../../kernel/stats/index.ts'
import { steepnessAt, type MeasuredCurve } from '../../kernel/wind/index.ts'
import { resampledHalfWidth } from './resampled-spread.ts'
import { PATH_LENGTH, type YawMoveRows } from './yaw-move-windows.ts'

/** Shares of rated power between which the mean of a row's two minutes must lie. */
const LEAST_SHARE = 0.05
const MOST_SHARE = 0.7
/** Fewer moves, or fewer one way round, decide nothing. */
const FEW_MOVES = 60
const FEW_MOVES_ONE_WAY = 15
/** Unknowns: d, levels of moves and of rests, and what the wind does along with its direction. */
const UNKNOWNS = 3 + PATH_LENGTH
const MAX_ITERATIONS = 30
/** Radians: a ten-thousandth of a degree. */
const CONVERGED_RAD = 2e-6
const MAX_OFFSET_RAD = 45 * RAD_PER_DEG
/** Beyond this yaw error the logarithm of the cosine runs away, radians. */
const MAX_YAW_ERROR_RAD = 75 * RAD_PER_DEG

export interface YawMoveRequest {
  /** p. */
  readonly exponent: number
  readonly ratedPowerKw: number
  /** d ln P / d ln u where the turbine makes so much power, kW; see {@link steepnessByPower}. NaN: not known, the row is left out. */
  readonly steepnessAtPower: (powerKw: number) => number
  readonly dayWeights: readonly DayWeights[]
  readonly minimumDays: number
}

/** The offset as yaw moves tell it; all numbers NaN where `failure` says why. */
export interface YawMoveOffset {
  /** d, degrees. */
  readonly offsetDeg: number
  /** At 95 %, from the scatter between days, degrees. */
  readonly halfWidthDeg: number
  readonly moves: number
  readonly clockwise: number
  readonly rests: number
  readonly days: number
  readonly failure: string | null
  readonly method: string
  readonly leansOn: string
}

/**
 * The static offset from power in the minute before against the minute after yaw moves, without anemometer or neighbours.
 *
 * A move takes the yaw error from v1 + d to v2 + d and the power with it:
 *
 *     (ln P2 - ln P1) / s = (p / 3) (ln cos(v2 + d) - ln cos(v1 + d)) + level + c . turns of the wind + change of the wind
 *
 * with the local steepness s. Clockwise and counter-clockwise moves weigh d with opposite signs, so that what both share
 * falls into the level. One thing does not: moves follow a turn of the wind, and where gusts veer, the wind before a move
 * is not the mean one and slackens after it, with the sign of the move (left alone a correlation of 0.2 shifts d by 3.6
 * degrees, measured). But for a given course of the wind's direction N + v the wind cares nothing for the nacelle: the
 * directions in windows from ten minutes before to two after stand in the regression, and rests, moments without a move,
 * tell what goes along with them. What is left to tell d is how far the nacelle travelled.
 *
 * Vane and nacelle position must have signs that agree; a log in which moves do not take the vane back is refused. Where
 * the vane's gain k is not 1 (v = k g - d) this finds d / k, what the rotor stands off: the travel is the nacelle's own.
 *
 * @source Gauss-Newton on the model above with Huber's weights (Huber 1964).
 */
export function yawMoveOffset(rows: YawMoveRows, request: YawMoveRequest): YawMoveOffset {
  const { dayWeights } = request
  const used = usedRows(rows, request)
  const moved = used.index.filter((i) => rows.travelDeg[i] !== 0)
  const counts = {
    moves: moved.length,
    clockwise: moved.filter((i) => rows.travelDeg[i]! > 0).length,
    rests: used.index.length - moved.length,
    days: new Set(moved.map((i) => rows.day[i]!)).size,
    method: 'power before and after yaw moves',
    leansOn: 'power and vane at a high rate; no anemometer, no neighbours; the exponent is taken as given',
  }
  const unknown = (failure: string): YawMoveOffset => ({
    ...counts,
    offsetDeg: NaN,
    halfWidthDeg: NaN,
    failure,
  })
  const oneWay = Math.min(counts.clockwise, counts.moves - counts.clockwise)
  if (counts.moves < FEW_MOVES || oneWay < FEW_MOVES_ONE_WAY) {
    return unknown(
      `${counts.moves} yaw moves below rated power can be used, ${oneWay} of them the rarer way round: ${FEW_MOVES} and ${FEW_MOVES_ONE_WAY} are needed`,
    )
  }
  if (counts.days < request.minimumDays) {
    return unknown(`yaw moves lie on ${counts.days} days, at least ${request.minimumDays} are needed`)
  }
  let takenBack = 0
  for (const i of moved) takenBack += rows.travelDeg[i]! * (rows.vaneBeforeDeg[i]! - rows.vaneAfterDeg[i]!)
  if (!(takenBack > 0)) {
    return unknown('yaw moves do not bring the vane back: vane and nacelle position have signs that disagree')
  }

  const fit = fitMoves(rows, used, request.exponent / 3)
  if (!fit) return unknown('the fit of power before and after yaw moves did not settle')
  // A bootstrap over B blocks spreads too little by (B - 1) / B. With it and the widest length 84 of 90 simulated turbines
  // were covered, without it fewer: so many unknowns are refitted in each resample.
  const halves = dayWeights
    .map((weights) => {
      const blocks = counts.days / weights.blockDays
      const half = resampledHalfWidth(resampledSteps(fit.sums, weights), weights, counts.days)
      return half * Math.sqrt(blocks / (blocks - 1))
    })
    .filter((half) => !Number.isNaN(half))
  if (halves.length === 0) return unknown('the days with yaw moves do not make two blocks')
  return {
    ...counts,
    offsetDeg: fit.offset * DEG_PER_RAD,
    halfWidthDeg: Math.max(...halves) * fit.stretch * DEG_PER_RAD,
    failure: null,
  }
}

/**
 * Steepness of a measured curve by power, for readings that shall not rest on an anemometer.
 *
 * @returns a function of kW; NaN outside of the curve.
 */
export function steepnessByPower(curve: MeasuredCurve): (powerKw: number) => number {
  const { speedsMs, fittedKw } = curve
  return (powerKw) => {
    const above = fittedKw.findIndex((power) => power >= powerKw)
    if (above < 1) return NaN
    const low = fittedKw[above - 1]!
    const share = (powerKw - low) / (fittedKw[above]! - low)
    return steepnessAt(curve, speedsMs[above - 1]! + share * (speedsMs[above]! - speedsMs[above - 1]!))
  }
}

interface UsedRows {
  readonly index: readonly number[]
  /** Of each used row. */
  readonly steepness: readonly number[]
}

/** Rows below rated power. Both minutes select alike: the one before by itself would select winds that then slacken. */
function usedRows(rows: YawMoveRows, { ratedPowerKw, steepnessAtPower }: YawMoveRequest): UsedRows {
  const index: number[] = []
  const steepness: number[] = []
  for (let i = 0; i < rows.day.length; i++) {
    const powerKw = Math.exp(rows.logPower[i]!)
    if (!(powerKw >= LEAST_SHARE * ratedPowerKw && powerKw <= MOST_SHARE * ratedPowerKw)) continue
    const local = steepnessAtPower(powerKw)
    if (!(local > 0.5)) continue
    index.push(i)
    steepness.push(local)
  }
  return { index, steepness }
}

/** Sums of w x x' (upper triangle) and w x r over the rows of each day, r being what the fit leaves. */
interface NormalByDay {
  readonly matrix: Map<number, Float64Array>
  readonly right: Map<number, Float64Array>
}

function fitMoves(
  rows: YawMoveRows,
  { index, steepness }: UsedRows,
  third: number,
): { offset: number; stretch: number; sums: NormalByDay } | null {
  const n = index.length
  const design = new Float64Array(n * UNKNOWNS)
  const target = new Float64Array(n)
  const weight = new Float64Array(n).fill(1)
  const residual = new Float64Array(n)
  const travelled = Float64Array.from(index, (i) => rows.travelDeg[i]!)
  let offset = 0
  for (let iteration = 0; iteration < MAX_ITERATIONS; iteration++) {
    for (let k = 0; k < n; k++) {
      const i = index[k]!
      const before = yawErrorOf(rows.vaneBeforeDeg[i]!, offset)
      const after = yawErrorOf(rows.vaneAfterDeg[i]!, offset)
      const at = k * UNKNOWNS
      design[at] = -third * (Math.tan(after) - Math.tan(before))
      design[at + 1] = travelled[k] === 0 ? 0 : 1
      design[at + 2] = travelled[k] === 0 ? 1 : 0
      for (let j = 0; j < PATH_LENGTH; j++)
        design[at + 3 + j] = rows.pathDeg[i * PATH_LENGTH + j]! * RAD_PER_DEG
      target[k] =
        rows.logPowerGain[i]! / steepness[k]! -
        third * (Math.log(Math.cos(after)) - Math.log(Math.cos(before)))
    }
    const { matrix, right } = totals(normalByDay(rows, index, design, target, weight))
    const solution = solvePositive(matrix, right)
    if (!solution) return null
    offset = Math.max(-MAX_OFFSET_RAD, Math.min(MAX_OFFSET_RAD, offset + solution[0]!))
    for (let k = 0; k < n; k++) {
      let fitted = 0
      for (let a = 0; a < UNKNOWNS; a++) fitted += design[k * UNKNOWNS + a]! * solution[a]!
      residual[k] = target[k]! - fitted
    }
    const sd = robustSd(residual)
    if (!(sd > 0)) {
      if (Math.abs(solution[0]!) < CONVERGED_RAD) {
        return { offset, stretch: 1, sums: normalByDay(rows, index, design, residual, weight) }
      }
      continue
    }
    if (iteration > 0 && Math.abs(solution[0]!) < CONVERGED_RAD) {
      const sums = normalByDay(rows, index, design, residual, weight)
      const standardised = residual.map((value) => value / sd)
      return { offset, stretch: robustStretch(standardised, travelled, (z) => huberWeight(z)), sums }
    }
    for (let k = 0; k < n; k++) weight[k] = huberWeight(residual[k]! / sd)
  }
  return null
}

function yawErrorOf(vaneDeg: number, offset: number): number {
  const error = vaneDeg * RAD_PER_DEG + offset
  return Math.max(-MAX_YAW_ERROR_RAD, Math.min(MAX_YAW_ERROR_RAD, error))
}

function normalByDay(
  rows: YawMoveRows,
  index: readonly number[],
  design: Float64Array,
  target: Float64Array,
  weight: Float64Array,
): NormalByDay {
  const matrix = new Map<number, Float64Array>()
  const right = new Map<number, Float64Array>()
  for (let k = 0; k < index.length; k++) {
    const day = rows.day[index[k]!]!
    let products = matrix.get(day)
    if (!products) matrix.set(day, (products = new Float64Array(UNKNOWNS * UNKNOWNS)))
    let joint = right.get(day)
    if (!joint) right.set(day, (joint = new Float64Array(UNKNOWNS)))
    const at = k * UNKNOWNS
    for (let a = 0; a < UNKNOWNS; a++) {
      const weighted = weight[k]! * design[at + a]!
      joint[a]! += weighted * target[k]!
      for (let b = a; b < UNKNOWNS; b++) products[a * UNKNOWNS + b]! += weighted * design[at + b]!
    }
  }
  return { matrix, right }
}

function totals(
  { matrix, right }: NormalByDay,
  timesOf: (day: number) => number = () => 1,
): { matrix: Float64Array; right: Float64Array } {
  const all = { matrix: new Float64Array(UNKNOWNS * UNKNOWNS), right: new Float64Array(UNKNOWNS) }
  for (const [day, products] of matrix) {
    const times = timesOf(day)
    if (times === 0) continue
    const joint = right.get(day)!
    for (let a = 0; a < products.length; a++) all.matrix[a]! += times * products[a]!
    for (let a = 0; a < UNKNOWNS; a++) all.right[a]! += times * joint[a]!
  }
  return all
}

/** Deviation of d in every resample of days, everything else refitted; radians. */
function resampledSteps(sums: NormalByDay, weights: DayWeights): Float64Array {
  const steps = new Float64Array(weights.resamples)
  for (let r = 0; r < weights.resamples; r++) {
    const { matrix, right } = totals(sums, (day) => weights.counts[r * weights.days + day]!)
    steps[r] = solvePositive(matrix, right)?.[0] ?? NaN
  }
  return steps
}

/**
 * Solves the normal equations by Cholesky's decomposition.
 *
 * @param matrix  upper triangle, row by row; overwritten.
 * @returns null when the unknowns cannot be told apart.
 */
function solvePositive(matrix: Float64Array, right: Float64Array): Float64Array | null {
  const n = right.length
  const factor = matrix
  for (let a = 0; a < n; a++) {
    const whole = factor[a * n + a]!
    for (let b = a; b < n; b++) {
      let rest = factor[a * n + b]!
      for (let k = 0; k < a; k++) rest -= factor[k * n + a]! * factor[k * n + b]!
      if (b === a) {
        if (!(rest > 1e-10 * whole)) return null
        factor[a * n + a] = Math.sqrt(rest)
      } else factor[a * n + b] = rest / factor[a * n + a]!
    }
  }
  const x = Float64Array.from(right)
  for (let a = 0; a < n; a++) {
    for (let k = 0; k < a; k++) x[a]! -= factor[k * n + a]! * x[k]!
    x[a]! /= factor[a * n + a]!
  }
  for (let a = n - 1; a >= 0; a--) {
    for (let b = a + 1; b < n; b++) x[a]! -= factor[a * n + b]! * x[b]!
    x[a]! /= factor[a * n + a]!
  }
  return x
}
