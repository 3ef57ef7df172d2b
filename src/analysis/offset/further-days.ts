/** Beyond this many more days nobody waits. */
const PRACTICAL_DAYS = 730

/**
 * How many more days would give a verdict, from half-width^2 = A^2 / days + B^2: A what days shrink, B what they do not.
 *
 * @param half.shrinking, half.fixed  half-widths at 95 %, degrees.
 * @returns days null when none are needed, or when no number of them would do; the note says which.
 */
export function furtherDays(
  standingDeg: number,
  half: { shrinking: number; fixed: number },
  days: number,
  thresholdDeg: number,
): { days: number | null; note: string } {
  const size = Math.abs(standingDeg)
  const needed = size < thresholdDeg ? thresholdDeg - size : size - thresholdDeg / 2
  if (Math.hypot(half.shrinking, half.fixed) <= needed) {
    return { days: null, note: 'no more days are needed for this verdict' }
  }
  if (half.fixed >= needed) {
    return {
      days: null,
      note: 'more days will not settle it; a reference instrument, neighbours or a month of rows at 1 Hz would',
    }
  }
  const further = Math.ceil((half.shrinking ** 2 * days) / (needed ** 2 - half.fixed ** 2) - days)
  if (further > PRACTICAL_DAYS) {
    return {
      days: null,
      note: 'the offset lies so close to the threshold that no practical number of days will settle it',
    }
  }
  return { days: further, note: `about ${further} more days of such data would settle it` }
}
