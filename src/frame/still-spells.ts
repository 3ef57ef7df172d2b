import { frozenRuns } from '../kernel/motion/index.ts'
import { medianOf, robustSd } from '../kernel/stats/index.ts'

/** Readings this near to each other count as one, as a share of the usual change from row to row. */
const SAME_SHARE = 0.03
/** An SD inside the interval below this share of the usual one is none: the sensor stood still inside the row as well. */
const STILL_SD_SHARE = 0.1
/** Chance that a whole log of a healthy sensor shows one still spell. */
const CHANCE = 1e-3
/** The longest runs are left out when the log says how often neighbours are equal by chance: they may be the fault itself. */
const LONGEST_RUNS = 6
/** Fewer pairs than this say nothing about chance. */
const FEW_PAIRS = 72
/** A run of this share of all readings is no spell. */
const WHOLE_LOG = 0.95
const SHORTEST_ROWS = 3
const SHORTEST_ROWS_WITH_SD = 2

/** A stretch of rows over which a sensor gave no measurement. */
export interface SensorSpell {
  /** Start of the first row, and end of the last, epoch ms. */
  readonly fromMs: number
  readonly toMs: number
  /** Rows of the log inside it. */
  readonly rows: number
  /** What the sensor read, median. */
  readonly value: number
  /** Median air temperature of its rows, degrees C; NaN where none is logged. */
  readonly airTemperatureC: number
  /** The other channels kept their values as well: the record stood still, not the sensor. */
  readonly recordHeld: boolean
}

export interface StillInput {
  readonly time: Float64Array
  readonly intervalMs: number
  /** The reading, its SD inside the interval where that is logged; length n, NaN = missing. */
  readonly values: Float64Array
  readonly sd?: Float64Array | undefined
  /** 1 = something moves that a working sensor would show; length n. */
  readonly live: Uint8Array
  readonly airTemperature?: Float64Array | undefined
  /** Channels that also stand still when a logger repeats its last record. */
  readonly others: readonly Float64Array[]
}

/** Rows of the spells, and of those beside them in which a spell began or ended. */
export interface StillSpells {
  readonly spells: readonly SensorSpell[]
  /** 1 = inside a spell; length n. */
  readonly inside: Uint8Array
  /** 1 = the row before or after a spell; length n. */
  readonly beside: Uint8Array
}

/**
 * Spells in which a sensor keeps one value while it should move.
 *
 * How long a run must be follows from the log itself: from the share of neighbouring rows that are equal by chance (which
 * grows with the step of the reading), so that one healthy log in a thousand shows a spell. Where the SD inside the interval
 * is logged and vanishes too, two rows are enough. Half of the rows of a spell, and two at least, must be live.
 * A sensor that never moves in the whole log has no spell.
 */
export function stillSpells(input: StillInput): StillSpells {
  const { time, values, sd, live } = input
  const n = time.length
  const inside = new Uint8Array(n)
  const beside = new Uint8Array(n)
  const spells: SensorSpell[] = []
  const usualSd = sd ? medianOf(sd.filter((_, i) => live[i] === 1)) : NaN
  const stillInside = (i: number): boolean => usualSd > 0 && sd![i]! <= STILL_SD_SHARE * usualSd
  const sameWithin = sameWithinOf(values, live)
  const candidates: { start: number; length: number }[] = []
  const take = (series: Float64Array, within: number, shortest: number): void => {
    const runs = frozenRuns(series, shortest, within)
    const least = Math.max(shortest, leastLength(series, live, runs, within, shortest))
    for (let k = 0; k < runs.start.length; k++) {
      if (runs.length[k]! >= least) candidates.push({ start: runs.start[k]!, length: runs.length[k]! })
    }
  }
  take(values, 0, SHORTEST_ROWS)
  if (sameWithin > 0) take(values, sameWithin, SHORTEST_ROWS)
  if (usualSd > 0) {
    // Rows that moved inside are no part of a run: each gets a value of its own.
    take(
      values.map((value, i) => (Number.isNaN(value) || stillInside(i) ? value : 1e6 + 1e3 * (i + 1))),
      sameWithin,
      SHORTEST_ROWS_WITH_SD,
    )
  }
  // A sensor that never moved is another matter: nothing in the log says that it ever did.
  const known = values.reduce((sum, value) => sum + (Number.isNaN(value) ? 0 : 1), 0)
  candidates.sort((a, b) => b.length - a.length || a.start - b.start)
  for (const { start, length } of candidates) {
    if (inside.subarray(start, start + length).includes(1) || length >= WHOLE_LOG * known) continue
    let liveRows = 0
    let read = 0
    for (let i = start; i < start + length; i++) {
      if (Number.isNaN(values[i]!)) continue
      read++
      liveRows += live[i]!
    }
    if (!(liveRows >= 2 && 2 * liveRows >= read)) continue
    const end = start + length
    spells.push(describe(input, start, end))
    inside.fill(1, start, end)
  }
  spells.sort((a, b) => a.fromMs - b.fromMs)
  for (let i = 0; i < n; i++) {
    if (inside[i] === 1) continue
    const before = inside[i - 1] === 1 && time[i]! - time[i - 1]! <= 1.5 * input.intervalMs
    const after = inside[i + 1] === 1 && time[i + 1]! - time[i]! <= 1.5 * input.intervalMs
    if (before || after) beside[i] = 1
  }
  return { spells, inside, beside }
}

/** Spread of values that count as one; 0 where too little is known. */
function sameWithinOf(values: Float64Array, live: Uint8Array): number {
  const changes = values.map((value, i) =>
    live[i] === 1 && live[i - 1] === 1 ? value - values[i - 1]! : NaN,
  )
  const usual = robustSd(changes)
  return usual > 0 ? SAME_SHARE * usual : 0
}

/** Rows of the shortest run that chance makes in one log of a thousand; Infinity where the log says nothing. */
function leastLength(
  values: Float64Array,
  live: Uint8Array,
  runs: { start: Int32Array; length: Int32Array },
  sameWithin: number,
  shortest: number,
): number {
  const longest = [...runs.length.keys()]
    .sort((a, b) => runs.length[b]! - runs.length[a]!)
    .slice(0, LONGEST_RUNS)
  const left = new Uint8Array(values.length)
  for (const k of longest) left.fill(1, runs.start[k], runs.start[k]! + runs.length[k]!)
  let pairs = 0
  let equal = 0
  for (let i = 1; i < values.length; i++) {
    const change = Math.abs(values[i]! - values[i - 1]!)
    if (left[i] === 1 || live[i] !== 1 || Number.isNaN(change)) continue
    pairs++
    // A run holds values on either side of its first one.
    if (change <= 2 * sameWithin) equal++
  }
  // A sensor that stands still nearly all the time leaves nothing to judge by: the whole log is one run.
  if (pairs < FEW_PAIRS) return shortest + 1
  if (equal === 0) return shortest
  const share = equal / pairs
  return share < 1 ? 1 + Math.ceil(Math.log(CHANCE / values.length) / Math.log(share)) : Infinity
}

function describe(input: StillInput, start: number, end: number): SensorSpell {
  const { time, values, airTemperature } = input
  return {
    fromMs: time[start]!,
    toMs: time[end - 1]! + input.intervalMs,
    rows: end - start,
    value: medianOf(values.subarray(start, end)),
    airTemperatureC: airTemperature ? medianOf(airTemperature.subarray(start, end)) : NaN,
    recordHeld: input.others.length > 0 && input.others.every((other) => isHeld(other, start, end)),
  }
}

function isHeld(values: Float64Array, start: number, end: number): boolean {
  let pairs = 0
  let equal = 0
  for (let i = start + 1; i < end; i++) {
    const change = values[i]! - values[i - 1]!
    if (Number.isNaN(change)) continue
    pairs++
    if (change === 0) equal++
  }
  return pairs > 0 && equal >= 0.9 * pairs
}
