import type { ZoneTable } from './zone-table.ts'

/** What is kept of a turbine while its rows pass. */
export interface TurbineTrack {
  readonly name: string
  rows: number
  /** Time of its last row, epoch ms; NaN before the first. */
  lastMs: number
  /** Latest time so far. */
  latestMs: number
  /** Whether its rows run backwards in time, told by the last step. */
  backwards: boolean
  /** Step (ms) -> how often; only steps forward. */
  readonly steps: Map<number, number>
  runStepMs: number
  runLength: number
}

const MOST_STEPS = 10_000

export function newTrack(name: string): TurbineTrack {
  return {
    name,
    rows: 0,
    lastMs: NaN,
    latestMs: -Infinity,
    backwards: false,
    steps: new Map(),
    runStepMs: 0,
    runLength: 0,
  }
}

/**
 * The instant of a wall-clock stamp. In the repeated hour the order of the turbine's rows decides: the earlier instant as long as
 * it lies after the row before, else the later one; the other way round where rows run backwards. A log that says itself
 * whether its clock shows summer time is taken at its word: the first pass of the repeated hour is summer time.
 * @param summer  what the row says; null = nothing.
 * @returns epoch ms; NaN in the spring gap.
 */
export function instantOf(
  wallMs: number,
  zone: ZoneTable,
  track: TurbineTrack,
  summer: boolean | null = null,
): number {
  const first = zone.first(wallMs)
  const second = zone.second(wallMs)
  if (summer !== null && !Number.isNaN(second)) return summer ? first : second
  if (Number.isNaN(second) || Number.isNaN(track.lastMs)) return first
  if (track.backwards) return second < track.lastMs ? second : first
  // Neither lies after the row before: the rows are out of order, and the earlier instant is as good as the later.
  return first > track.lastMs || second <= track.lastMs ? first : second
}

/** What a cell of a summer-time column says; null when it is empty or says something else. */
export function isSummer(text: string): boolean | null {
  if (/^(1|true|t|yes|y|dst|summer|s)$/i.test(text)) return true
  if (/^(0|false|f|no|n|std|st|standard|winter|w)$/i.test(text)) return false
  return null
}

/** Notes a row. Answers whether its time lies after all earlier ones of the turbine. */
export function track(state: TurbineTrack, timeMs: number): boolean {
  const step = timeMs - state.lastMs
  if (step > 0) {
    if (step === state.runStepMs) state.runLength++
    else {
      flushSteps(state)
      state.runStepMs = step
      state.runLength = 1
    }
  }
  if (step !== 0 && !Number.isNaN(step)) state.backwards = step < 0
  state.rows++
  state.lastMs = timeMs
  if (!(timeMs > state.latestMs)) return false
  state.latestMs = timeMs
  return true
}

/** Steps of a run of equal ones are added at once: a map is not asked per row. */
export function flushSteps(state: TurbineTrack): void {
  const { runStepMs, runLength, steps } = state
  if (runLength === 0) return
  if (steps.has(runStepMs) || steps.size < MOST_STEPS)
    steps.set(runStepMs, (steps.get(runStepMs) ?? 0) + runLength)
  state.runLength = 0
}

/** The commonest step, the shorter one of equals; null without any. */
export function commonestStep(steps: ReadonlyMap<number, number>): number | null {
  let best: number | null = null
  let count = 0
  for (const [step, n] of steps) {
    if (n > count || (n === count && best !== null && step < best)) {
      best = step
      count = n
    }
  }
  return best
}
