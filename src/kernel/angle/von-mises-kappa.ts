import { InputError } from '../../errors.ts'
import { besselRatio, besselRatioDeficit, LARGE_KAPPA } from './bessel-ratio.ts'

/** Below this 2 R is exact: the next term is R^3. */
const SMALL_RESULTANT = 1e-8

const MAX_ITERATIONS = 60

/** Newton's error after a step of this relative size is below rounding. */
const LAST_STEP = 1e-9

/**
 * Concentration of a von Mises distribution from the resultant length: the maximum likelihood root of A_1(kappa) = R, exact
 * to the digits that R holds (not the piecewise approximation of Best & Fisher, which is up to 1 % off). For small n it is
 * too large: see {@link vonMisesKappaCorrected}.
 *
 * @param resultant  no unit; 0 gives 0, 1 and above (rounding) Infinity, NaN gives NaN
 * @returns kappa, no unit, 0 to Infinity
 * @throws InputError OUT_OF_RANGE for a resultant below 0
 * @source Mardia & Jupp (2000), sec. 5.3
 * @example vonMisesKappa(0) // 0
 */
export function vonMisesKappa(resultant: number): number {
  if (resultant < 0) throw new InputError('OUT_OF_RANGE', `resultant: expected 0 to 1, got ${resultant}`)
  if (Number.isNaN(resultant)) return NaN
  if (resultant >= 1) return Infinity
  if (resultant < SMALL_RESULTANT) return 2 * resultant

  const step = bestFisher(resultant) > LARGE_KAPPA ? largeStep : smallStep
  let kappa = bestFisher(resultant)
  for (let i = 0; i < MAX_ITERATIONS; i++) {
    const change = step(kappa, resultant)
    kappa += change
    if (Math.abs(change) <= LAST_STEP * kappa) return kappa
  }
  throw new Error(`vonMisesKappa: no root found for a resultant of ${resultant}`)
}

/**
 * Concentration with the correction for small samples: below 2, max(kappa - 2 / (n kappa), 0); from 2 on,
 * (n - 1)^3 kappa / (n^3 + n). The two do not meet at 2.
 *
 * @param resultant  as for {@link vonMisesKappa}
 * @param count      n, how many angles the resultant came from; 1 and more
 * @throws InputError OUT_OF_RANGE for a resultant below 0 or a count below 1
 * @source Best & Fisher (1981), The bias of the maximum likelihood estimators of the von Mises-Fisher concentration
 *   parameters; Fisher (1993), ch. 4
 */
export function vonMisesKappaCorrected(resultant: number, count: number): number {
  if (!(count >= 1)) throw new InputError('OUT_OF_RANGE', `count: expected >= 1, got ${count}`)
  const kappa = vonMisesKappa(resultant)
  if (kappa < 2) return kappa > 0 ? Math.max(kappa - 2 / (count * kappa), 0) : 0
  if (count === 1) return 0 // one angle says nothing about spread; 0 times Infinity otherwise
  return ((count - 1) ** 3 * kappa) / (count ** 3 + count)
}

/** Starting value, within 1 % of the root; A_1 is concave, so Newton's steps from it close in from the left. */
function bestFisher(resultant: number): number {
  const r = resultant
  if (r < 0.53) return 2 * r + r ** 3 + (5 * r ** 5) / 6
  if (r < 0.85) return -0.4 + 1.39 * r + 0.43 / (1 - r)
  return 1 / (r * (1 - r) * (3 - r))
}

function smallStep(kappa: number, resultant: number): number {
  const ratio = besselRatio(kappa)
  const derivative = 1 - ratio / kappa - ratio * ratio
  return (resultant - ratio) / derivative
}

/** The derivative from its series: the closed form of smallStep cancels down to nothing for large kappa. */
function largeStep(kappa: number, resultant: number): number {
  const inverse = 1 / kappa
  const derivative = 0.5 * inverse * inverse * (1 + inverse * (0.5 + inverse * (0.75 + inverse * (25 / 16))))
  return (besselRatioDeficit(kappa) - (1 - resultant)) / derivative
}
