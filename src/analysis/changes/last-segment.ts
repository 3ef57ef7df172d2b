import type { TurbineFrame } from '../../frame/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'
import type { HeadingRecord, HeadingStep } from './offset-changes-heading.ts'
import { offsetChanges, type OffsetChange, type OffsetHistory } from './offset-changes.ts'

/** Without headings a change is dated from power alone, which takes this many days with rows. */
const DAYS_FOR_POWER = 40

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
  /** Steps of the heading that the position sensor made, by power. */
  readonly positionSteps: readonly HeadingStep[]
  /** Steps of the heading that power cannot lay to vane or position sensor. */
  readonly undecided: readonly HeadingStep[]
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
  const still: LastSegment = { fromMs: -Infinity, changes: [], positionSteps: [], undecided: [] }
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
    positionSteps: history.positionSteps,
    undecided: undecidedSteps(history, heading),
  }
}

/** Without a fit of the offset nothing is decided. */
function undecidedSteps(history: OffsetHistory, heading: HeadingRecord | null): HeadingStep[] {
  const steps = heading?.steps ?? []
  if (history.segments.length === 0) return steps.filter((step) => !history.positionSteps.includes(step))
  const moments = new Set(
    history.changes.filter(({ seenIn }) => seenIn === 'heading').map(({ atMs }) => atMs),
  )
  return steps.filter(({ atMs }) => moments.has(atMs))
}

function changesOffset(change: OffsetChange, events: readonly TurbineEvent[]): boolean {
  if (change.seenIn === 'heading') return false // power can neither confirm nor deny that the vane did it
  if (change.seenIn !== 'event') return true
  const [low, high] = change.sizeInterval95Deg
  return low > 0 || high < 0 || events.some(({ atMs, changesOffset: sure }) => sure && atMs === change.atMs)
}

function iso(ms: number): string {
  return new Date(ms).toISOString()
}
