import { normalProbability, shrink } from '../../kernel/stats/index.ts'
import { lossShare } from '../../kernel/wind/index.ts'
import { NORMAL_95 } from '../offset/resampled-spread.ts'

/** Scale of the prior of the spread between turbines of a farm, degrees: offsets of a few degrees are usual, of 10 rare. */
const SPREAD_SCALE_DEG = 3

export interface MeasuredOffset {
  /** m; NaN = not measured. */
  readonly standingDeg: number
  /** Its 95 % half-width, were the exponent known. */
  readonly halfDeg: number
}

export interface ShrunkOffsets {
  /** What the group has in common, its standard deviation, and the spread between turbines; degrees. */
  readonly commonDeg: number
  readonly commonSdDeg: number
  readonly spreadDeg: number
  /** m of each turbine and its standard deviation; length as given. A turbine that is not measured gets the group's. */
  readonly meanDeg: Float64Array
  readonly sdDeg: Float64Array
}

/**
 * Misalignments of a group of turbines, each drawn towards the others as far as its error asks for: of many estimates the
 * largest are the ones that chance has favoured most.
 *
 * @returns NaN when nothing is measured.
 */
export function shrunkOffsets(measured: readonly MeasuredOffset[]): ShrunkOffsets {
  const { common, commonSd, spread, mean, sd } = shrink(
    measured.map(({ standingDeg }) => standingDeg),
    measured.map(({ halfDeg }) => halfDeg / NORMAL_95),
    { spreadScale: SPREAD_SCALE_DEG },
  )
  return { commonDeg: common, commonSdDeg: commonSd, spreadDeg: spread, meanDeg: mean, sdDeg: sd }
}

/** Probability that |m| exceeds a threshold, for m normal about a mean. Degrees; NaN gives NaN. */
export function probabilityBeyond(meanDeg: number, sdDeg: number, thresholdDeg: number): number {
  const upTo = (deg: number): number => normalProbability((deg - meanDeg) / sdDeg)
  return 1 - upTo(thresholdDeg) + upTo(-thresholdDeg)
}

/**
 * What a misalignment costs, from what some others cost: the share 1 - cos^p is taken out, and what is left, which hardly
 * bends, is taken straight between the points.
 *
 * @param points  misalignments and their costs, any unit, rising, none at 0.
 * @returns NaN without points.
 */
export function costAt(
  points: readonly { standingDeg: number; cost: number }[],
  standingDeg: number,
  exponent: number,
): number {
  if (standingDeg === 0 && points.length > 0) return 0
  const rates = points
    .filter((point) => Math.sign(point.standingDeg) === Math.sign(standingDeg))
    .map((point) => ({ deg: point.standingDeg, rate: point.cost / lossShare(point.standingDeg, exponent) }))
  const next = rates.findIndex(({ deg }) => deg >= standingDeg)
  const right = next < 0 ? rates.at(-1) : rates[next]
  const left = next < 0 ? right : (rates[next - 1] ?? right)
  if (right === undefined || left === undefined) return NaN
  const share = right === left ? 0 : (standingDeg - left.deg) / (right.deg - left.deg)
  return lossShare(standingDeg, exponent) * (left.rate + share * (right.rate - left.rate))
}
