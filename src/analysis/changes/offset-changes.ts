import { DEG_PER_RAD, wrap180 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { HeadingRecord, HeadingStep } from './offset-changes-heading.ts'
import { deviationOver, powerByDay, searchPower, type PowerByDay } from './offset-changes-power.ts'
import { offsetRows, type OffsetRows } from '../offset/offset-rows.ts'

const DAY_MS = 86_400_000
/** Evidence of power, twice the log-likelihood, from which a heading step is laid to the vane or to the position sensor: 7 to 1. */
const DECIDED = 4
/** Standard deviations beyond which power contradicts both. */
const CONTRADICTED = 3.3
/** A step of heading so near to an event is taken to be the event. */
const SAME_MOMENT_MS = DAY_MS
/** Larger steps are the position sensor's: with such an offset the turbine would hardly run. Degrees. */
const MOST_OF_A_VANE_DEG = 30
/** Refits after which offsets of segments stand still to a tenth of their error. */
const ROUNDS = 2

export interface OffsetChangesInput {
  /** Wind speeds corrected for the anemometer's response where it is known: what is constant cancels in changes. */
  readonly turbine: TurbineFrame
  /** Calendar days of the window. */
  readonly days: number
  readonly exponent: number
  /** What {@link headingSteps} tells of this turbine; null: nothing. */
  readonly heading: HeadingRecord | null
  /** Moments at which something was done to this turbine that may change its offset: events, corrections; epoch ms. */
  readonly eventsMs?: readonly number[]
}

export interface OffsetChange {
  /** First moment with the new offset, epoch ms. */
  readonly atMs: number
  /** 95 %, epoch ms; no width for an event. */
  readonly interval: readonly [fromMs: number, toMs: number]
  readonly fromDeg: number
  readonly toDeg: number
  readonly sizeDeg: number
  readonly sizeInterval95Deg: readonly [number, number]
  /**
   * both: heading stepped, power confirms that the vane did it; size and date are those of the heading unless power
   * contradicts its size. power: no heading to look at. event: given, whether anything changed or not. heading: heading
   * stepped, and power can neither confirm nor deny: vane or position sensor; the size is what power shows.
   */
  readonly seenIn: 'power' | 'heading' | 'both' | 'event'
}

/** Time with one offset. */
export interface OffsetSegment {
  readonly fromMs: number
  readonly toMs: number
  /** d, degrees; NaN where too few rows tell. */
  readonly offsetDeg: number
  /** Statistical alone, at 95 %: response, exponent and dilution are for the offset's own interval. */
  readonly halfWidthDeg: number
  /** Segments with the same number share one estimate: what lies between them is known from the heading. */
  readonly estimate: number
  /** Rows used, and pieces of days with such rows. */
  readonly rows: number
  readonly days: number
}

export interface OffsetHistory {
  /** In order of time. */
  readonly changes: readonly OffsetChange[]
  /** One more than changes; empty when the offset cannot be fitted. */
  readonly segments: readonly OffsetSegment[]
  /** Steps of the position sensor: N + v stepped, power did not. Not changes of the offset. */
  readonly positionSteps: readonly HeadingStep[]
}

type Cause = 'vane' | 'unknown' | 'other' | 'event' | 'power'

/** A moment to be judged: a step of the heading, or an event. */
interface Moment {
  readonly atMs: number
  readonly step: HeadingStep | null
}

/** The offset regression with moments that split days, and the vane of each period between them moved by so many degrees. */
type FitWith = (moments: readonly number[], movedDeg: readonly number[]) => PowerByDay | null

/** A moment that parts two segments. */
interface Boundary {
  readonly atMs: number
  readonly interval: readonly [number, number]
  readonly cause: Cause
  /** Heading that stepped here, if any. */
  readonly step: HeadingStep | null
}

/**
 * When the static offset of a turbine changed, and to what. A vane that is knocked so that it reads 7 degrees less raises
 * d by 7 and lowers N + v by 7; a position sensor that slips moves N + v alone. So each step of the heading is held
 * against power before and after it. Without a whole record of the heading, power is searched on its own, day by day.
 *
 * Costs a few fits of the offset.
 *
 * @returns no segments and no changes when the rows do not tell an offset; NaN where a segment's rows do not.
 */
export function offsetChanges(input: OffsetChangesInput): OffsetHistory {
  const { turbine, days, exponent, heading } = input
  const rows = offsetRows(turbine, days)
  const clock = { firstMs: turbine.time[0] ?? NaN, intervalMs: turbine.intervalS * 1000 }
  const endMs = (turbine.time.at(-1) ?? NaN) + clock.intervalMs
  const inside = (ms: number): boolean => ms > clock.firstMs && ms < endMs
  const fitWith: FitWith = (moments, movedDeg) =>
    powerByDay(rows, clock, { exponent, responsePerDeg: 0 }, moments, movedDeg)

  const steps = (heading?.steps ?? []).filter((step) => inside(step.atMs))
  const events = [...new Set(input.eventsMs ?? [])].filter(
    (ms) => inside(ms) && !steps.some((step) => Math.abs(step.atMs - ms) <= SAME_MOMENT_MS),
  )
  const moments: Moment[] = [
    ...steps.map((step) => ({ atMs: step.atMs, step })),
    ...events.map((atMs) => ({ atMs, step: null })),
  ].sort((a, b) => a.atMs - b.atMs)
  const times = moments.map(({ atMs }) => atMs)
  const asSlips = fitWith(
    times,
    [0, ...moments].map(() => 0),
  )
  if (!asSlips) return { changes: [], segments: [], positionSteps: [] }
  const asVanes =
    steps.length > 0
      ? fitWith(times, summed(moments.map(({ step }) => (isVaneSized(step) ? -step.sizeDeg : 0))))
      : asSlips

  const given: Boundary[] = []
  const positionSteps: HeadingStep[] = []
  moments.forEach(({ atMs, step }, k) => {
    if (!step) {
      given.push({ atMs, interval: [atMs, atMs], cause: 'event', step })
      return
    }
    const { cause, slip } = causeOf(step, asSlips, asVanes, k)
    if (slip) positionSteps.push(slip)
    if (cause !== 'slip') given.push({ atMs, interval: step.intervalMs, cause, step })
  })

  const boundaries = heading?.whole
    ? given
    : [...given, ...changesInPower(given, fitWith)].sort((a, b) => a.atMs - b.atMs)
  const settled = settle(boundaries, fitWith)
  if (!settled) return { changes: [], segments: [], positionSteps }
  return { ...history(boundaries, settled, { rows, ...clock, endMs }), positionSteps }
}

/**
 * Whether the vane or the position sensor made a step of the heading, by the power of the periods before and after it:
 * what changes in power where the step is no change of the offset, and what is left where it is one.
 * `slip` is what the position sensor did, null where nothing says that it did anything.
 */
function causeOf(
  step: HeadingStep,
  asSlips: PowerByDay,
  asVanes: PowerByDay | null,
  k: number,
): { cause: Cause | 'slip'; slip: HeadingStep | null } {
  const changed = changeBetween(asSlips, k)
  const left = asVanes && isVaneSized(step) ? changeBetween(asVanes, k) : { deg: Infinity, sdDeg: 1 }
  const ifSlip = Math.abs(changed.deg) / changed.sdDeg
  const ifVane = Math.abs(left.deg) / left.sdDeg
  if (ifSlip > CONTRADICTED && ifVane > CONTRADICTED) {
    return { cause: 'other', slip: { ...step, sizeDeg: wrap180(step.sizeDeg + changed.deg) } }
  }
  const evidence = ifSlip ** 2 - ifVane ** 2
  if (evidence > DECIDED) return { cause: 'vane', slip: null }
  if (evidence < -DECIDED) return { cause: 'slip', slip: step }
  return { cause: 'unknown', slip: null }
}

function isVaneSized(step: HeadingStep | null): step is HeadingStep {
  return step !== null && Math.abs(step.sizeDeg) <= MOST_OF_A_VANE_DEG
}

/** Change of the deviation from period k to the next, with its SD; degrees. */
function changeBetween(power: PowerByDay, k: number): { deg: number; sdDeg: number } {
  const before = deviationOver(power, ...piecesOf(power, k, k))
  const after = deviationOver(power, ...piecesOf(power, k + 1, k + 1))
  return { deg: after.deg - before.deg, sdDeg: Math.hypot(before.sdDeg, after.sdDeg) }
}

/** Pieces [from, to) of the periods `first` to `last`. */
function piecesOf(power: PowerByDay, first: number, last: number): [number, number] {
  let from = 0
  while (from < power.period.length && power.period[from]! < first) from++
  let to = from
  while (to < power.period.length && power.period[to]! <= last) to++
  return [from, to]
}

/** Sums of the first 0, 1, 2 ... values. */
function summed(values: readonly number[]): number[] {
  const sums = [0]
  for (const value of values) sums.push(sums.at(-1)! + value)
  return sums
}

/** Degrees that the offsets of the segments lie above that of the first, as far as the heading tells. */
function knownMoves(boundaries: readonly Boundary[]): number[] {
  return summed(boundaries.map(({ cause, step }) => (cause === 'vane' && step ? -step.sizeDeg : 0)))
}

/** Number of the estimate of each segment: segments that a step of the heading joins share one. */
function estimates(boundaries: readonly Boundary[]): number[] {
  return summed(boundaries.map(({ cause }) => (cause === 'vane' ? 0 : 1)))
}

/** What power alone shows: each stretch between boundaries that the heading does not bridge is searched by itself. */
function changesInPower(given: readonly Boundary[], fitWith: FitWith): Boundary[] {
  const power = fitWith(
    given.map(({ atMs }) => atMs),
    knownMoves(given),
  )
  if (!power) return []
  const groups = estimates(given)
  return [...new Set(groups)].flatMap((group) => {
    const [from, to] = piecesOf(power, groups.indexOf(group), groups.lastIndexOf(group))
    return searchPower(power, from, to).map(({ at, low, high }): Boundary => {
      const endMs = power.startMs[high + 1] ?? power.startMs[high]! + DAY_MS
      return { atMs: power.startMs[at]!, interval: [power.startMs[low]!, endMs], cause: 'power', step: null }
    })
  })
}

/** The offset of each segment relative to one fitted offset, degrees. */
interface Settled {
  readonly power: PowerByDay
  /** Per segment. */
  readonly movedDeg: readonly number[]
  /** Per estimate. */
  readonly deviation: readonly ReturnType<typeof deviationOver>[]
}

/**
 * Offsets of the segments between boundaries. The model is linear near the fitted offset only: so the vane is moved by
 * what was found, and what is left is fitted anew.
 */
function settle(boundaries: readonly Boundary[], fitWith: FitWith): Settled | null {
  const times = boundaries.map(({ atMs }) => atMs)
  const groups = estimates(boundaries)
  let movedDeg = knownMoves(boundaries)
  for (let round = 0; ; round++) {
    const power = fitWith(times, movedDeg)
    if (!power) return null
    const deviation = [...new Set(groups)].map((group) =>
      deviationOver(power, ...piecesOf(power, groups.indexOf(group), groups.lastIndexOf(group))),
    )
    if (round === ROUNDS || deviation.length === 1) return { power, movedDeg, deviation }
    // A segment without rows stays where it is.
    const base = deviation.find(({ deg }) => !Number.isNaN(deg))?.deg ?? 0
    movedDeg = movedDeg.map((moved, s) => {
      const { deg } = deviation[groups[s]!]!
      return Number.isNaN(deg) ? moved : moved + deg - base
    })
  }
}

/** The segments between boundaries, and what changed at each. */
function history(
  boundaries: readonly Boundary[],
  { power, movedDeg, deviation }: Settled,
  log: { rows: OffsetRows; firstMs: number; intervalMs: number; endMs: number },
): Pick<OffsetHistory, 'changes' | 'segments'> {
  const edges = [log.firstMs, ...boundaries.map(({ atMs }) => atMs), log.endMs]
  const fittedDeg = power.fit.offset * DEG_PER_RAD - log.rows.centreDeg
  const segments = estimates(boundaries).map((estimate, s): OffsetSegment => {
    const [from, to] = piecesOf(power, s, s)
    return {
      fromMs: edges[s]!,
      toMs: edges[s + 1]!,
      offsetDeg: wrap180(fittedDeg + deviation[estimate]!.deg + movedDeg[s]!),
      halfWidthDeg: deviation[estimate]!.halfWidthDeg,
      estimate,
      rows: countRows(log, edges[s]!, edges[s + 1]!),
      days: to - from,
    }
  })
  const changes = boundaries.map(({ atMs, interval, cause, step }, k): OffsetChange => {
    const [before, after] = [segments[k]!, segments[k + 1]!]
    const sizeDeg = wrap180(after.offsetDeg - before.offsetDeg)
    const half =
      cause === 'vane' && step ? step.halfWidthDeg : Math.hypot(before.halfWidthDeg, after.halfWidthDeg)
    return {
      atMs,
      interval,
      fromDeg: before.offsetDeg,
      toDeg: after.offsetDeg,
      sizeDeg,
      sizeInterval95Deg: [sizeDeg - half, sizeDeg + half],
      seenIn: SEEN_IN[cause],
    }
  })
  return { changes, segments }
}

const SEEN_IN = {
  vane: 'both',
  other: 'both',
  unknown: 'heading',
  event: 'event',
  power: 'power',
} as const satisfies Record<Cause, OffsetChange['seenIn']>

function countRows(
  { rows, firstMs, intervalMs }: { rows: OffsetRows; firstMs: number; intervalMs: number },
  fromMs: number,
  toMs: number,
): number {
  let count = 0
  for (const position of rows.position) {
    const timeMs = firstMs + position * intervalMs
    if (timeMs >= fromMs && timeMs < toMs) count++
  }
  return count
}
