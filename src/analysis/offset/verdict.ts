import type { TurbineSheet } from '../../sheet/index.ts'

export interface Verdict {
  readonly verdict: TurbineSheet['verdict']
  readonly code: string
  /** One sentence. */
  readonly text: string
}

/**
 * Judges the standing misalignment m. `offset`: |m| reaches the threshold and the nearer end of its interval lies beyond half
 * of it. `aligned`: the whole interval lies inside the threshold. Else `undetermined`.
 *
 * @param standingDeg  m, degrees; interval95Deg its interval, with what is not known of the exponent; thresholdDeg > 0.
 * @param given  the exponent in force, and the interval as it would be were that one known: where it alone would settle
 *   the matter, the sentence says so.
 */
export function verdictOf(
  standingDeg: number,
  interval95Deg: readonly [number, number],
  thresholdDeg: number,
  given: { exponent: number; interval95Deg: readonly [number, number] } | null = null,
): Verdict {
  const [low, high] = interval95Deg
  const shown = `${signed(standingDeg)} degrees (95 %: ${signed(low)} to ${signed(high)})`
  const nearerEnd = low > 0 ? low : high < 0 ? -high : 0
  if (Math.abs(standingDeg) >= thresholdDeg && nearerEnd > thresholdDeg / 2) {
    return { verdict: 'offset', code: 'beyond-threshold', text: `the rotor stands off the wind: ${shown}` }
  }
  if (low > -thresholdDeg && high < thresholdDeg) {
    return {
      verdict: 'aligned',
      code: 'inside-threshold',
      text: `the rotor faces the wind to within ${thresholdDeg} degrees: ${shown}`,
    }
  }
  const [lowGiven, highGiven] = given?.interval95Deg ?? [NaN, NaN]
  if (given && lowGiven > -thresholdDeg && highGiven < thresholdDeg) {
    const further = -low > high ? low : high
    return {
      verdict: 'undetermined',
      code: 'exponent-not-known',
      text:
        `no sign of an offset: were the exponent known to be ${given.exponent}, the rotor would face the wind to within ` +
        `${thresholdDeg} degrees (95 %: ${signed(lowGiven)} to ${signed(highGiven)}); other exponents let it reach ${signed(further)}: ${shown}`,
    }
  }
  return {
    verdict: 'undetermined',
    code: 'interval-too-wide',
    text: `the interval is too wide for a threshold of ${thresholdDeg} degrees: ${shown}`,
  }
}

function signed(value: number): string {
  return `${value < 0 ? '' : '+'}${value.toFixed(1)}`
}
