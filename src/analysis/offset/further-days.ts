import { noDoubt, withExponentDoubt, type ExponentDoubt } from './exponent-doubt.ts'
import { verdictOf } from './verdict.ts'

/** Beyond this many more days nobody waits. */
const PRACTICAL_DAYS = 730
/** A half-width this small stands for data without an end, degrees. */
const LEAST_HALF_DEG = 1e-6
const HALVINGS = 20
const TOO_CLOSE = 'the offset lies so close to the threshold that no practical number of days will settle it'

/**
 * How many more days would give a verdict, from half-width^2 = A^2 / days + B^2: A what days shrink, B what they do not.
 * The exponent comes on top of both, as {@link withExponentDoubt} lets it, and no number of days tells it.
 *
 * @param half.shrinking, half.fixed  half-widths at 95 %, degrees, with the exponent taken as given.
 * @returns days null when none are needed, or when no number of them would do; the note says which.
 */
export function furtherDays(
  standingDeg: number,
  half: { shrinking: number; fixed: number },
  days: number,
  { thresholdDeg, doubt }: { thresholdDeg: number; doubt: ExponentDoubt },
): { days: number | null; note: string } {
  const settles = (halfDeg: number, of: ExponentDoubt = doubt): boolean => {
    const { interval } = withExponentDoubt(standingDeg, Math.max(halfDeg, LEAST_HALF_DEG), of)
    return verdictOf(standingDeg, interval, thresholdDeg).verdict !== 'undetermined'
  }
  const now = Math.hypot(half.shrinking, half.fixed)
  if (settles(now)) return { days: null, note: 'no more days are needed for this verdict' }
  const noDays = { days: null, note: 'more days will not settle it; a reference instrument would' }
  // What is wide beside an exponent that is known comes first: while it stands, m itself says little of other exponents.
  if (half.fixed > 0 && !settles(half.fixed, noDoubt(doubt.given))) {
    return {
      days: null,
      note: 'more days will not settle it; a reference instrument, neighbours or a month of rows at 1 Hz would',
    }
  }
  if (!settles(LEAST_HALF_DEG)) {
    if (!(doubt.high > doubt.low)) return { days: null, note: TOO_CLOSE }
    const exponent = Math.abs(standingDeg) < thresholdDeg ? doubt.low : doubt.high
    const far = (standingDeg * doubt.given) / exponent
    return {
      days: null,
      note:
        `more days will not settle it: at the exponent ${doubt.given} m is ${standingDeg.toFixed(1)}, at ${exponent} ` +
        `it would be ${far.toFixed(1)}; a reference instrument would`,
    }
  }
  if (!settles(half.fixed)) return noDays
  let [enough, tooWide] = [half.fixed, now]
  for (let k = 0; k < HALVINGS; k++) {
    const middle = (enough + tooWide) / 2
    if (settles(middle)) enough = middle
    else tooWide = middle
  }
  const further = Math.ceil((half.shrinking ** 2 * days) / (enough ** 2 - half.fixed ** 2) - days)
  // NaN ends here too: `enough` is no wider than what does not shrink.
  if (!(further <= PRACTICAL_DAYS)) {
    return { days: null, note: TOO_CLOSE }
  }
  return { days: further, note: `about ${further} more days of such data would settle it` }
}
