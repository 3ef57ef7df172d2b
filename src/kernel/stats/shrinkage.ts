import { InputError } from '../../errors.ts'

/** Points of the grid over which the spread is averaged, up to so many prior scales. */
const GRID = 60
const GRID_SCALES = 3

/** Values of a group that share a mean, as seen through their errors. */
export interface Shrunk {
  /** Posterior mean of the common value and its SD. */
  readonly common: number
  readonly commonSd: number
  /** Posterior mean of the spread between the members. */
  readonly spread: number
  /** Posterior mean of each member, its SD, and how much of its own measurement is in it, 0 to 1. Length n. */
  readonly mean: Float64Array
  readonly sd: Float64Array
  readonly ownShare: Float64Array
}

/**
 * Partial pooling: members a_i ~ normal(common, spread^2), measured as b_i ~ normal(a_i, s_i^2). The common value has a flat
 * prior; the spread, which few members tell badly, a half-normal one, and is averaged over instead of fixed: a group
 * that happens to look alike is not taken to be alike.
 *
 * @param measured  b; length n >= 1. NaN = not measured: such a member gets the group's value and spread.
 * @param sd        s > 0; length n; NaN = not measured.
 * @param prior.spreadScale  scale of the half-normal prior of the spread, > 0, in the unit of `measured`.
 * @returns NaN when nothing is measured.
 * @throws InputError LENGTH_MISMATCH, OUT_OF_RANGE
 * @source Gelman et al. (2013), Bayesian Data Analysis, 3rd ed., section 5.4 (normal hierarchical model), integrated on a grid.
 */
export function shrink(
  measured: ArrayLike<number>,
  sd: ArrayLike<number>,
  prior: { spreadScale: number; commonMean?: number; commonSd?: number },
): Shrunk {
  const n = measured.length
  if (sd.length !== n) throw new InputError('LENGTH_MISMATCH', `sd: expected ${n} values, got ${sd.length}`)
  if (!(prior.spreadScale > 0)) {
    throw new InputError('OUT_OF_RANGE', `spreadScale: expected > 0, got ${prior.spreadScale}`)
  }
  const priorWeight = prior.commonSd === undefined ? 0 : 1 / prior.commonSd ** 2
  const priorMean = prior.commonMean ?? 0
  const logDensity = new Float64Array(GRID)
  const conditional = Array.from({ length: GRID }, (_, g) => {
    const spread = ((g + 0.5) / GRID) * GRID_SCALES * prior.spreadScale
    const given = givenSpread(measured, sd, spread, { weight: priorWeight, mean: priorMean })
    logDensity[g] = given.logDensity - (spread / prior.spreadScale) ** 2 / 2
    return { spread, ...given }
  })
  const top = logDensity.reduce((most, value) => Math.max(most, value), -Infinity)
  const weights = logDensity.map((value) => Math.exp(value - top))
  const total = weights.reduce((sum, value) => sum + value, 0)
  const average = (valueOf: (given: (typeof conditional)[number]) => number): number =>
    conditional.reduce((sum, given, g) => sum + weights[g]! * valueOf(given), 0) / total

  const common = average((given) => given.common)
  const commonSd = Math.sqrt(average((given) => given.commonVariance + (given.common - common) ** 2))
  const mean = new Float64Array(n)
  const memberSd = new Float64Array(n)
  const ownShare = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    const own = (given: (typeof conditional)[number]) => memberGiven(given, measured[i]!, sd[i]!)
    mean[i] = average((given) => own(given).mean)
    memberSd[i] = Math.sqrt(average((given) => own(given).variance + (own(given).mean - mean[i]!) ** 2))
    ownShare[i] = average((given) => own(given).share)
  }
  return { common, commonSd, spread: average((given) => given.spread), mean, sd: memberSd, ownShare }
}

/** Common value, its variance and the marginal log density (but for a constant) at a fixed spread. */
function givenSpread(
  measured: ArrayLike<number>,
  sd: ArrayLike<number>,
  spread: number,
  prior: { weight: number; mean: number },
): { common: number; commonVariance: number; logDensity: number } {
  let weightSum = prior.weight
  let sum = prior.weight * prior.mean
  for (let i = 0; i < measured.length; i++) {
    if (!isMeasured(measured[i]!, sd[i]!)) continue
    const weight = 1 / (sd[i]! ** 2 + spread ** 2)
    weightSum += weight
    sum += weight * measured[i]!
  }
  const common = sum / weightSum
  let logDensity = -Math.log(weightSum) / 2 - (prior.weight * (common - prior.mean) ** 2) / 2
  for (let i = 0; i < measured.length; i++) {
    if (!isMeasured(measured[i]!, sd[i]!)) continue
    const variance = sd[i]! ** 2 + spread ** 2
    logDensity -= Math.log(variance) / 2 + (measured[i]! - common) ** 2 / variance / 2
  }
  return { common, commonVariance: 1 / weightSum, logDensity }
}

function memberGiven(
  given: { spread: number; common: number; commonVariance: number },
  measured: number,
  sd: number,
): { mean: number; variance: number; share: number } {
  const spreadVariance = given.spread ** 2
  if (!isMeasured(measured, sd)) {
    return { mean: given.common, variance: spreadVariance + given.commonVariance, share: 0 }
  }
  const share = spreadVariance / (spreadVariance + sd ** 2)
  return {
    mean: given.common + share * (measured - given.common),
    variance: share * sd ** 2 + (1 - share) ** 2 * given.commonVariance,
    share,
  }
}

function isMeasured(value: number, sd: number): boolean {
  return !Number.isNaN(value) && sd > 0
}
