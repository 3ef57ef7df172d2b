import type { DecodingAccount } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'

/** Where both tracks change at once in more than this share of all changes, rows come too seldom for the encoder. */
const SLOW_SHARE = 0.02
/** Fewer such changes say nothing. */
const FEW_JUMPS = 5
/** From so many index pulses out of place on, or this share of them, the count cannot be relied on. */
const FAULT_ERRORS = 3
const FAULT_SHARE = 0.1

/**
 * Pulses of the nacelle position that were not counted: seen where an index pulse came out of its place, or where both tracks
 * changed between two rows so that nobody knows which way.
 */
export function missingPulses({ pulses }: DecodingAccount): SensorFinding[] {
  if (pulses === null) return []
  const { indexErrors, indexPulses, jumps, changes, degPerCount } = pulses
  const missed = indexErrors.reduce((sum, { counts }) => sum + Math.abs(counts), 0)
  const jumped = `both tracks changed at once in ${jumps} of ${changes} changes`
  const detail = {
    jumps,
    changes,
    indexPulses,
    indexErrors: indexErrors.length,
    missedCounts: missed,
    missedDeg: missed * degPerCount,
    degPerCount,
  }
  if (indexErrors.length > 0) {
    const isFault = indexErrors.length >= FAULT_ERRORS && indexErrors.length >= FAULT_SHARE * indexPulses
    return [
      {
        sensor: 'nacelle-position',
        kind: 'missing-pulses',
        finding:
          `pulses were missed: the index came out of its place in ${indexErrors.length} of ${indexPulses} passages, ` +
          `${missed} counts or ${(missed * degPerCount).toFixed(1)} degrees in all; ${jumped}`,
        severity: isFault ? 'fault' : 'warn',
        howSure: 'likely',
        checkFirst:
          'At the desk: compare nacelle.pulsesPerTurn and nacelle.gearRatio with the parts list, and the interval of the log with the yaw rate; then the gap of the pick-up, its cable and its plug.',
        from: new Date(indexErrors[0]!.timeMs).toISOString(),
        to: new Date(indexErrors.at(-1)!.timeMs).toISOString(),
        detail,
      },
    ]
  }
  if (jumps < FEW_JUMPS || jumps < SLOW_SHARE * changes) return []
  return [
    {
      sensor: 'nacelle-position',
      kind: 'missing-pulses',
      finding: `${jumped}: which way the nacelle went is not known there, and nothing was counted`,
      severity: 'warn',
      howSure: 'possible',
      checkFirst:
        'At the desk: see whether rows come often enough, more than one per count while the nacelle turns; then whether one of the two tracks drops out.',
      from: null,
      to: null,
      detail,
    },
  ]
}
