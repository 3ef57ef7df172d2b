import type { TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'
import type { HeadingStep } from '../changes/offset-changes-heading.ts'
import type { NacelleRecord } from './nacelle-records.ts'
import type { SlowSlip } from './nacelle-slip.ts'

/** With an offset of more a turbine would hardly run: such a step is the position sensor's. Degrees. */
const MOST_OF_A_VANE_DEG = 30
/** A north this far off is named, degrees. */
const NAMED_NORTH_DEG = 10
/** Readings averaged across the end of the scale are named from this many rows on; warned of from this share. */
const NAMED_ROWS = 20
const WARNED_SHARE = 0.01

const KNOWN_BEARING =
  'At the desk: look for work at the yaw sensor or a north parameter that was set at that time. Then read the position against a known bearing.'
const SENSOR_AT_STOPS =
  'At the desk: read the event log of stops and of the controller’s restarts, and the parameter that keeps the position without power. Then battery and index mark of the position sensor.'
const SLIPPING =
  'At the desk: compare photographs or notes of the last zeroing. In the nacelle: play and grip of the sensor’s pinion and shaft.'

/** What power says of the steps of this turbine's heading. */
export interface StepCauses {
  readonly positionSteps: readonly HeadingStep[]
  readonly undecided: readonly HeadingStep[]
}

/** What is wrong with the nacelle position of one turbine. Steps that the vane made are not here: they are changes of its offset. */
export function nacelleFindings(
  turbine: TurbineFrame,
  record: NacelleRecord,
  causes: StepCauses,
): SensorFinding[] {
  const bySize = causes.undecided.filter(({ sizeDeg }) => Math.abs(sizeDeg) > MOST_OF_A_VANE_DEG)
  const open = causes.undecided.filter((step) => !bySize.includes(step))
  return [
    ...unrelated(turbine, record),
    ...zeroLostOf(turbine, record),
    ...causes.positionSteps.map((step) => positionStep(step, 'and power did not')),
    ...bySize.map((step) => positionStep(step, 'by more than a vane can be off while the turbine runs')),
    ...open.map(unexplained),
    ...record.slips.map(slip),
    ...record.stuck.map(({ fromMs, toMs, ranAwayDeg }) =>
      finding({
        kind: 'frozen',
        finding: `the position stood still for ${hours(toMs - fromMs)} while the nacelle turned: with the vane it ran ${ranAwayDeg.toFixed(0)} degrees away from the farm’s wind`,
        severity: 'warn',
        howSure: 'likely',
        checkFirst:
          'At the desk: read the position live while the turbine yaws. Then cable and coupling of the sensor.',
        fromMs,
        toMs,
        detail: { ranAwayDeg },
      }),
    ),
    ...jumpsOf(record),
    ...acrossNorthOf(turbine),
    ...northOf(turbine, record),
  ]
}

function unrelated(turbine: TurbineFrame, record: NacelleRecord): SensorFinding[] {
  if (record.state !== 'unrelated') return []
  return [
    finding({
      kind: 'not-usable',
      finding:
        'the nacelle position has nothing to do with the wind that the other turbines see: nothing is drawn from it',
      severity: 'warn',
      howSure: 'certain',
      checkFirst:
        'At the desk: see whether the right channel is mapped; then read the position live while the turbine yaws.',
      ...whole(turbine),
      detail: {},
    }),
  ]
}

function zeroLostOf(turbine: TurbineFrame, { zeroLost }: NacelleRecord): SensorFinding[] {
  if (!zeroLost) return []
  const { jumps, atStops, afterStops, medianJumpDeg, largestJumpDeg } = zeroLost
  const when = afterStops
    ? `${atStops} of them at a stop or a gap of the log`
    : `${atStops} of them at a stop`
  return [
    finding({
      kind: 'zero-lost',
      finding: `the position takes another zero again and again: ${jumps} times, ${when}, by ${medianJumpDeg.toFixed(0)} degrees as a median and ${largestJumpDeg.toFixed(0)} at most`,
      severity: 'warn',
      howSure: 'certain',
      checkFirst: SENSOR_AT_STOPS,
      ...whole(turbine),
      detail: { jumps, atStops, medianJumpDeg, largestJumpDeg },
    }),
  ]
}

function positionStep(step: HeadingStep, why: string): SensorFinding {
  return finding({
    kind: 'position-step',
    finding: `the reading stepped by ${step.sizeDeg.toFixed(1)} degrees against the farm, ${why}: the position sensor, not the vane`,
    severity: 'warn',
    howSure: 'likely',
    checkFirst: KNOWN_BEARING,
    fromMs: step.intervalMs[0],
    toMs: step.intervalMs[1],
    detail: { at: iso(step.atMs), sizeDeg: step.sizeDeg, halfWidthDeg: step.halfWidthDeg },
  })
}

function unexplained(step: HeadingStep): SensorFinding {
  return finding({
    kind: 'unexplained-step',
    finding: `nacelle position plus vane stepped by ${step.sizeDeg.toFixed(1)} degrees against the farm; power cannot tell whether vane or position sensor did it`,
    severity: 'warn',
    howSure: 'possible',
    checkFirst: KNOWN_BEARING,
    fromMs: step.intervalMs[0],
    toMs: step.intervalMs[1],
    detail: { at: iso(step.atMs), sizeDeg: step.sizeDeg, halfWidthDeg: step.halfWidthDeg },
  })
}

function slip(one: SlowSlip): SensorFinding {
  const detail = { sizeDeg: one.sizeDeg, degPerDay: one.degPerDay, lostPerDegree: one.perDegree }
  const common = { severity: 'warn', howSure: 'likely', fromMs: one.fromMs, toMs: one.toMs, detail } as const
  if (one.with !== 'time') {
    const share = (100 * Math.abs(one.perDegree!)).toFixed(1)
    const how = one.with === 'travel' ? 'with every degree turned, either way' : 'in proportion to the turns'
    return finding({
      ...common,
      kind: 'missing-pulses',
      finding: `the position runs away from the farm ${how}: ${share} % of the travel, ${one.sizeDeg.toFixed(1)} degrees in all`,
      checkFirst:
        'At the desk: the entered gear ratio and pulses per turn. In the nacelle: distance of the proximity switches, missing or dirty teeth, cables.',
    })
  }
  return finding({
    ...common,
    kind: 'slow-slip',
    finding: `the position slips slowly against the farm: ${one.degPerDay.toFixed(2)} degrees a day, ${one.sizeDeg.toFixed(1)} in all`,
    checkFirst: SLIPPING,
  })
}

function jumpsOf({ jumps, state }: NacelleRecord): SensorFinding[] {
  if (!jumps || state === 'unrelated' || state === 'reversed') return []
  const parts: string[] = []
  if (jumps.tooFast > 0)
    parts.push(`${jumps.tooFast} times from one row to the next faster than any yaw drive turns`)
  if (jumps.away > 0)
    parts.push(`${jumps.away} single rows far from those around while the turbine faced the wind`)
  return [
    finding({
      kind: 'impossible-jump',
      finding: `the position jumped as no nacelle does: ${parts.join('; ')}, by ${jumps.largestDeg.toFixed(0)} degrees at most`,
      severity: jumps.tooFast + jumps.away > 2 ? 'warn' : 'info',
      howSure: 'likely',
      checkFirst:
        'At the desk: the rows around these moments, restarts of controller or logger. Then cable and plug of the sensor.',
      fromMs: jumps.firstMs,
      toMs: jumps.lastMs,
      detail: { tooFast: jumps.tooFast, away: jumps.away, largestDeg: jumps.largestDeg },
    }),
  ]
}

function acrossNorthOf(turbine: TurbineFrame): SensorFinding[] {
  const rows = turbine.averagedAcrossNorth.nacelle_position
  const share = rows / turbine.time.length
  if (!(rows >= NAMED_ROWS)) return []
  return [
    finding({
      kind: 'averaged-across-north',
      finding: `in ${rows} rows (${(100 * share).toFixed(1)} %) the logger averaged the position arithmetically over the end of its scale: these rows are no directions`,
      severity: share >= WARNED_SHARE ? 'warn' : 'info',
      howSure: 'likely',
      checkFirst: 'At the desk: set the logger to average angles as vectors, or log the wound position.',
      ...whole(turbine),
      detail: { rows, share },
    }),
  ]
}

function northOf(turbine: TurbineFrame, record: NacelleRecord): SensorFinding[] {
  const last = record.levels.at(-1)
  if (record.state !== 'compared' || !last || !(Math.abs(last.deg) >= NAMED_NORTH_DEG)) return []
  return [
    finding({
      kind: 'north-offset',
      finding: `the position stands ${last.deg.toFixed(1)} degrees off the farm’s consensus: its north is not that of the other turbines. No yaw error follows from it`,
      severity: 'info',
      howSure: 'certain',
      checkFirst:
        'At the desk: the north parameter. Then the position against a known bearing; no climb for this alone.',
      ...whole(turbine),
      detail: { northMinusVaneOffsetDeg: last.deg, halfWidthDeg: last.halfWidthDeg },
    }),
  ]
}

interface Found {
  readonly kind: SensorFinding['kind']
  readonly finding: string
  readonly severity: SensorFinding['severity']
  readonly howSure: SensorFinding['howSure']
  readonly checkFirst: string
  readonly fromMs: number
  readonly toMs: number
  readonly detail: Record<string, unknown>
}

function finding({ fromMs, toMs, ...rest }: Found): SensorFinding {
  return { sensor: 'nacelle-position', ...rest, from: iso(fromMs), to: iso(toMs) }
}

function whole(turbine: TurbineFrame): { fromMs: number; toMs: number } {
  return { fromMs: turbine.time[0]!, toMs: turbine.time.at(-1)! + turbine.intervalS * 1000 }
}

function hours(ms: number): string {
  return ms >= 2 * 86_400_000
    ? `${(ms / 86_400_000).toFixed(1)} days`
    : `${(ms / 3_600_000).toFixed(1)} hours`
}

function iso(ms: number): string {
  return new Date(ms).toISOString()
}
