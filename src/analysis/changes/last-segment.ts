import type { TurbineFrame } from '../../frame/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'
import type { HeadingRecord } from './offset-changes-heading.ts'
import { offsetChanges, type OffsetChange, type OffsetHistory } from './offset-changes.ts'

/** Without headings a change is dated from power alone, which takes this many days with rows. */
const DAYS_FOR_POWER = 40
const NORTH_FIRST =
  'At the desk: look for work at the yaw sensor or a north parameter that was set at that time. Then read the position against a known bearing.'

/** Something that was done to a turbine and may have changed its offset. */
export interface TurbineEvent {
  readonly atMs: number
  /** True: the offset is another one from then on, whether power can tell it or not. */
  readonly changesOffset: boolean
}

export interface LastSegment {
  /** First moment of the offset that holds at the end; -Infinity when it never changed. */
  readonly fromMs: number
  readonly changes: TurbineSheet['staticOffset']['changes']
  readonly findings: TurbineSheet['sensors']
}

/**
 * Since when the offset is what it is at the end of the window: a vane that was knocked has two offsets, not their mean.
 *
 * @param heading  steps of this turbine's heading against the farm; null: none to be had.
 * @param usedDays days with used rows.
 */
export function lastSegment(
  turbine: TurbineFrame,
  question: {
    days: number
    usedDays: number
    exponent: number
    heading: HeadingRecord | null
    events: readonly TurbineEvent[]
  },
): LastSegment {
  const { heading, events, days, exponent } = question
  const still: LastSegment = { fromMs: -Infinity, changes: [], findings: [] }
  const quiet = heading !== null && heading.whole && heading.steps.length === 0
  if (events.length === 0 && (quiet || (heading === null && question.usedDays < DAYS_FOR_POWER))) return still

  const history = offsetChanges({
    turbine,
    days,
    exponent,
    heading,
    eventsMs: events.map(({ atMs }) => atMs),
  })
  const real = history.changes.filter((change) => changesOffset(change, events))
  return {
    fromMs: real.at(-1)?.atMs ?? -Infinity,
    changes: real.map((change) => ({
      at: iso(change.atMs),
      from: iso(change.interval[0]),
      to: iso(change.interval[1]),
      fromDeg: change.fromDeg,
      toDeg: change.toDeg,
      sizeDeg: change.sizeDeg,
      sizeInterval95Deg: [...change.sizeInterval95Deg],
      seenIn: change.seenIn,
    })),
    findings: [
      ...positionSteps(history),
      ...history.changes.filter(({ seenIn }) => seenIn === 'heading').map(undecided),
    ],
  }
}

function changesOffset(change: OffsetChange, events: readonly TurbineEvent[]): boolean {
  if (change.seenIn === 'heading') return false // power can neither confirm nor deny that the vane did it
  if (change.seenIn !== 'event') return true
  const [low, high] = change.sizeInterval95Deg
  return low > 0 || high < 0 || events.some(({ atMs, changesOffset: sure }) => sure && atMs === change.atMs)
}

function positionSteps(history: OffsetHistory): TurbineSheet['sensors'] {
  return history.positionSteps.map((step) => ({
    sensor: 'nacelle-position',
    kind: 'position-step',
    finding: `the reading stepped by ${step.sizeDeg.toFixed(1)} degrees against the farm, and power did not: the position sensor, not the vane`,
    severity: 'warn',
    howSure: 'likely',
    checkFirst: NORTH_FIRST,
    from: iso(step.intervalMs[0]),
    to: iso(step.intervalMs[1]),
    detail: { sizeDeg: step.sizeDeg, halfWidthDeg: step.halfWidthDeg },
  }))
}

function undecided(change: OffsetChange): TurbineSheet['sensors'][number] {
  return {
    sensor: 'nacelle-position',
    kind: 'unexplained-step',
    finding: 'the heading stepped against the farm; power cannot tell whether vane or position sensor did it',
    severity: 'warn',
    howSure: 'possible',
    checkFirst: NORTH_FIRST,
    from: iso(change.interval[0]),
    to: iso(change.interval[1]),
    detail: { sizeByPowerDeg: change.sizeDeg, sizeInterval95Deg: [...change.sizeInterval95Deg] },
  }
}

function iso(ms: number): string {
  return new Date(ms).toISOString()
}
