import { resampledSlopes, shrink, type DayWeights } from '../../kernel/stats/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import type { FarmComparison } from './farm-comparison.ts'
import { neighbourSlopes, type NeighbourSlopes } from './neighbour-slopes.ts'
import { NORMAL_95, resampledHalfWidth } from '../offset/resampled-spread.ts'

/** Scale of the half-normal prior of the spread between anemometers of a model, per degree: 0.07 % was seen on a real farm. */
const SPREAD_SCALE_PER_DEG = 0.0006

/** SD of what the form with local directions leaves of a link, as a share of what it takes out (measured on simulated farms with a link of 0.2). */
const LINK_REMAINDER = 0.18
/** A difference between the two forms of less than the root of this many SDs counts as none. */
const CHANCE = 3

/** What neighbours tell of one anemometer; relative change of the reading per degree of vane. */
export interface TurbineResponse {
  /** Estimate, with what its model tells. */
  readonly perDeg: number
  readonly sdPerDeg: number
  /** From this turbine's own comparison alone, and its SD. */
  readonly ownPerDeg: number
  readonly ownSdPerDeg: number
  readonly rows: number
}

export interface ModelResponse {
  readonly model: string
  readonly perDeg: number
  readonly sdPerDeg: number
  readonly spreadPerDeg: number
  readonly turbines: number
}

export interface FarmResponse {
  /** In the order of the farm; null where a turbine cannot be compared. */
  readonly turbines: readonly (TurbineResponse | null)[]
  readonly models: readonly ModelResponse[]
  /**
   * How much of the form with local directions is in the answer, 0 to 1: local speed and local direction are linked as far
   * as the two forms differ beyond chance.
   */
  readonly linkShare: number
  /** Mean difference between the forms, per degree, and its SD; NaN without nacelle positions. */
  readonly linkPerDeg: number
  readonly linkSdPerDeg: number
}

/**
 * Response of each anemometer to the vane, from its wind speed against its neighbours' at the same time.
 *
 * Two forms: plain, and with the local direction (now, three intervals before, one after) in the regression, which takes out
 * that local gusts may veer. The second one is right in both cases and less precise; it counts as far as the mean
 * difference between the two, over the farm, exceeds its own chance (positive-part shrinkage), and the interval holds what
 * is left open. Turbines of a model share a mean and a spread, both estimated.
 */
export function anemometerResponse(
  comparison: FarmComparison,
  dayWeights: readonly DayWeights[],
  settings: ScoringSettings,
): FarmResponse {
  const { grid, logSpeed, vane, localDirection } = comparison
  const question = {
    grid,
    days: comparison.days,
    directionDeg: comparison.direction.consensusDeg,
    own: logSpeed,
    others: logSpeed,
    x: vane,
    otherX: vane,
    unrest: comparison.turbulence,
  }
  const plain = resampleAll(neighbourSlopes({ ...question, nuisance: [] }), dayWeights)
  const lagged =
    localDirection.length > 0
      ? resampleAll(neighbourSlopes({ ...question, nuisance: localDirection }), dayWeights)
      : null
  const link = linkBetween(plain, lagged, dayWeights)
  const mixed = lagged === null ? plain : mix(plain, lagged, link.share)

  const k = grid.turbines.length
  const ownSd = new Float64Array(k).fill(NaN)
  for (let i = 0; i < k; i++) ownSd[i] = meanSd(mixed, i, dayWeights)
  const turbines: (TurbineResponse | null)[] = new Array<TurbineResponse | null>(k).fill(null)
  const models: ModelResponse[] = []
  // What stays open between the two forms, and what the second one leaves of a link, moves all turbines alike.
  const linkTaken = Number.isNaN(link.mean) ? 0 : link.share * link.mean
  const openSd = Math.hypot(
    (1 - link.share) * (Number.isNaN(link.sd) ? 0 : link.sd),
    LINK_REMAINDER * linkTaken,
  )
  for (const model of new Set(grid.turbines.map((turbine) => turbine.model))) {
    const members = grid.turbines.flatMap((turbine, i) => (turbine.model === model ? [i] : []))
    const shrunk = shrink(
      members.map((i) => mixed.coefficient[i]!),
      members.map((i) => ownSd[i]!),
      {
        spreadScale: SPREAD_SCALE_PER_DEG,
        commonMean: 0,
        commonSd: (2 * settings.responseSpreadPctPerDeg) / 100 || 1e-9,
      },
    )
    members.forEach((i, m) => {
      if (Number.isNaN(mixed.coefficient[i]!)) return
      turbines[i] = {
        perDeg: shrunk.mean[m]!,
        sdPerDeg: Math.hypot(shrunk.sd[m]!, openSd),
        ownPerDeg: mixed.coefficient[i]!,
        ownSdPerDeg: ownSd[i]!,
        rows: mixed.rows[i]!,
      }
    })
    const compared = members.filter((i) => turbines[i] !== null).length
    if (compared === 0) continue
    models.push({
      model,
      perDeg: shrunk.common,
      sdPerDeg: Math.hypot(shrunk.commonSd, openSd),
      spreadPerDeg: shrunk.spread,
      turbines: compared,
    })
  }
  return { turbines, models, linkShare: link.share, linkPerDeg: link.mean, linkSdPerDeg: link.sd }
}

/** Coefficients of all turbines with their deviations in every resample: [block length][turbine][resample]. */
interface Resampled {
  readonly coefficient: Float64Array
  readonly deviations: readonly (readonly Float64Array[])[]
  readonly rows: readonly number[]
  readonly days: readonly number[]
}

function resampleAll(slopes: NeighbourSlopes, dayWeights: readonly DayWeights[]): Resampled {
  const k = slopes.slopes.length
  return {
    coefficient: slopes.coefficient,
    rows: slopes.slopes.map((slope) => slope?.rows ?? 0),
    days: slopes.slopes.map((slope) => slope?.days ?? 0),
    deviations: dayWeights.map((weights) => {
      const direct = slopes.slopes.map((slope) =>
        slope
          ? resampledSlopes(slope.sums, weights).map(
              (value) => slope.direct + (value - slope.direct) * slope.stretch,
            )
          : null,
      )
      const out = Array.from({ length: k }, () => new Float64Array(weights.resamples).fill(NaN))
      const one = new Float64Array(k)
      for (let r = 0; r < weights.resamples; r++) {
        for (let i = 0; i < k; i++) one[i] = direct[i]?.[r] ?? NaN
        const solved = slopes.solve(one)
        for (let i = 0; i < k; i++) out[i]![r] = solved[i]! - slopes.coefficient[i]!
      }
      return out
    }),
  }
}

function mix(plain: Resampled, lagged: Resampled, share: number): Resampled {
  const between = (a: number, b: number): number => (Number.isNaN(b) ? a : a + share * (b - a))
  return {
    rows: plain.rows,
    days: plain.days,
    coefficient: plain.coefficient.map((value, i) => between(value, lagged.coefficient[i]!)),
    deviations: plain.deviations.map((all, w) =>
      all.map((values, i) => values.map((value, r) => between(value, lagged.deviations[w]![i]![r]!))),
    ),
  }
}

/**
 * SD of a coefficient as the spread between turbines is judged by: the mean over block lengths, since the widest of
 * several would make turbines look more alike than they are.
 */
function meanSd(resampled: Resampled, i: number, dayWeights: readonly DayWeights[]): number {
  const halves = dayWeights
    .map((weights, w) => resampledHalfWidth(resampled.deviations[w]![i]!, weights, resampled.days[i]!))
    .filter((half) => !Number.isNaN(half))
  return halves.reduce((sum, half) => sum + half, 0) / halves.length / NORMAL_95
}

/** Whether the two forms differ beyond chance, over all turbines that both can compare. */
function linkBetween(
  plain: Resampled,
  lagged: Resampled | null,
  dayWeights: readonly DayWeights[],
): { share: number; mean: number; sd: number } {
  if (lagged === null) return { share: 0, mean: NaN, sd: NaN }
  const both = [...plain.coefficient.keys()].filter(
    (i) => !Number.isNaN(plain.coefficient[i]!) && !Number.isNaN(lagged.coefficient[i]!),
  )
  if (both.length === 0) return { share: 0, mean: NaN, sd: NaN }
  const meanOf = (valueOf: (i: number) => number): number =>
    both.reduce((sum, i) => sum + valueOf(i), 0) / both.length
  const mean = meanOf((i) => lagged.coefficient[i]! - plain.coefficient[i]!)
  const days = Math.max(...both.map((i) => plain.days[i]!))
  let sd = 0
  dayWeights.forEach((weights, w) => {
    const differences = Float64Array.from({ length: weights.resamples }, (_, r) =>
      meanOf((i) => lagged.deviations[w]![i]![r]! - plain.deviations[w]![i]![r]!),
    )
    const half = resampledHalfWidth(differences, weights, days)
    if (half / NORMAL_95 > sd) sd = half / NORMAL_95
  })
  return { share: sd > 0 ? Math.max(0, 1 - CHANCE * (sd / mean) ** 2) : 1, mean, sd }
}
