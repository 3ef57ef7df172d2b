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
 * @param standingDeg  m, degrees; interval95Deg its interval; thresholdDeg > 0.
 */
export function verdictOf(
  standingDeg: number,
  interval95Deg: readonly [number, number],
  thresholdDeg: number,
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
  return {
    verdict: 'undetermined',
    code: 'interval-too-wide',
    text: `the interval is too wide for a threshold of ${thresholdDeg} degrees: ${shown}`,
  }
}

function signed(value: number): string {
  return `${value < 0 ? '' : '+'}${value.toFixed(1)}`
}
