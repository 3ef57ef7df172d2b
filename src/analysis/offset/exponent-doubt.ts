import { normalProbability } from '../../kernel/stats/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import { NORMAL_95 } from './resampled-spread.ts'

/**
 * Weight of the exponent in force; the rest is spread evenly over the range. With it 95 % at an exponent of 2 in a range of
 * 1.4 to 3 are held (measured on simulated farms), and an interval about 0 grows by 1.3 and not by 2.1.
 */
const GIVEN_SHARE = 0.5
/** Exponents that stand for the range. */
const GRID = 12
/** Of an end of an interval, degrees. */
const PRECISION_DEG = 1e-3

/** The exponent that the data are read with, and the range in which the true one may lie. */
export interface ExponentDoubt {
  readonly given: number
  /** At most `given`. */
  readonly low: number
  /** At least `given`. */
  readonly high: number
}

/** An interval that holds what is not known of the exponent. */
export interface DoubtedInterval {
  readonly interval: readonly [number, number]
  /** The exponent at which the interval as the given exponent makes it would reach so far, for each end. */
  readonly endExponents: readonly [number, number]
  /** How much further than with the given exponent known it reaches, the end that moves more; degrees. */
  readonly part: number
}

/** The range of the settings, widened to hold the exponent in force. */
export function exponentDoubt(
  settings: Pick<ScoringSettings, 'exponent' | 'exponentLow' | 'exponentHigh'>,
): ExponentDoubt {
  const { exponent: given, exponentLow, exponentHigh } = settings
  return { given, low: Math.min(exponentLow, given), high: Math.max(exponentHigh, given) }
}

/** An exponent that has no say, as with a reference instrument. */
export function noDoubt(given: number): ExponentDoubt {
  return { given, low: given, high: given }
}

/**
 * The 95 % interval of m where the exponent is not known. Power shows p m: what is read as m at the exponent `given` is
 * m given / p at p. Ends are those quantiles at 2.5 and 97.5 % of a normal error about m, scaled so, with p as likely as
 * not the given one and else anywhere in the range; but no end lies inside the interval of the given exponent. A range that
 * ends at the given exponent therefore moves only ends that point away from 0.
 *
 * @param standingDeg  m at the given exponent; NaN: not known.
 * @param halfDeg      its half-width at 95 % if the exponent were known.
 */
export function withExponentDoubt(
  standingDeg: number,
  halfDeg: number,
  doubt: ExponentDoubt,
): DoubtedInterval {
  const knownLow = -(halfDeg - standingDeg)
  const knownHigh = standingDeg + halfDeg
  const low = -upperEnd(-standingDeg, halfDeg, doubt)
  const high = upperEnd(standingDeg, halfDeg, doubt)
  const exponentOf = (known: number, reached: number): number =>
    known === reached || Math.abs(reached) < PRECISION_DEG ? doubt.given : (doubt.given * known) / reached
  return {
    interval: [low, high],
    endExponents: [exponentOf(knownLow, low), exponentOf(knownHigh, high)],
    part: Math.max(knownLow - low, high - knownHigh),
  }
}

function upperEnd(centreDeg: number, halfDeg: number, { given, low, high }: ExponentDoubt): number {
  const known = halfDeg + centreDeg
  // NaN ends here too.
  if (!(high > low) || !(halfDeg > 0) || Number.isNaN(known)) return known
  const sd = halfDeg / NORMAL_95
  const below = (end: number): number => {
    let sum = 0
    for (let k = 0; k < GRID; k++) {
      const exponent = low + ((k + 0.5) / GRID) * (high - low)
      sum += normalProbability(((end * exponent) / given - centreDeg) / sd)
    }
    return GIVEN_SHARE * normalProbability((end - centreDeg) / sd) + ((1 - GIVEN_SHARE) * sum) / GRID
  }
  let [inside, outside] = [known, known * (given / (known > 0 ? low : high))]
  if (below(inside) >= 0.975) return inside
  while (outside - inside > PRECISION_DEG) {
    const middle = (inside + outside) / 2
    if (below(middle) >= 0.975) outside = middle
    else inside = middle
  }
  return outside
}
