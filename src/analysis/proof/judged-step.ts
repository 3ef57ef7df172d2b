import { studentQuantile } from '../../kernel/stats/index.ts'
import { stepWithinCells } from './step-within-cells.ts'

const DAY_MS = 86_400_000
const HOUR_MS = 3_600_000
/** Hours of rows below which a side says nothing. */
const LEAST_BEFORE_H = 12
const LEAST_AFTER_H = 6
/** Share of the rows after that must lie in cells seen before. */
const LEAST_SEEN = 0.5
/** Earlier dates that are tried. */
const DATES = 6
const LEAST_DAYS_BEFORE_DATE = 5

/** Epoch ms; each side is [from, to). */
export interface Sides {
  readonly beforeFromMs: number
  readonly beforeToMs: number
  readonly afterFromMs: number
  readonly afterToMs: number
}

/** What of one turbine is compared: see `stepWithinCells`. */
export interface ComparedSeries {
  readonly value: Float64Array
  readonly cell: Int32Array
}

export interface Placebo {
  readonly turbine: number
  readonly atMs: number
  /** Scaled to the days of the correction. */
  readonly step: number
}

/** A step with an interval that is at least as wide as what shows where nothing was done. */
export interface JudgedStep {
  readonly step: number
  /** At 95 %. NaN: cannot be told. */
  readonly halfWidth: number
  readonly rowsBefore: number
  readonly rowsAfter: number
  readonly daysBefore: number
  readonly daysAfter: number
  readonly placebos: readonly Placebo[]
  /** Root mean square of the placebos' steps; NaN without any. */
  readonly spread: number
}

export interface JudgedQuestion {
  readonly target: number
  /** Turbines at which nothing was changed. */
  readonly neighbours: readonly number[]
  readonly seriesOf: (turbine: number) => ComparedSeries
  readonly cells: number
  /** Calendar day of each interval. */
  readonly day: Int32Array
  readonly clock: { readonly fromMs: number; readonly intervalMs: number }
  readonly sides: Sides
  readonly atMs: number
  /** Lengths of blocks taken as independent, hours. */
  readonly blocksH: readonly number[]
}

/**
 * The step of a series at a correction. Its interval is the wider of two: what blocks of rows show, and what the same
 * comparison gives where nothing was done - at unchanged neighbours on the same date, and at all of them on earlier dates
 * with as many days after where the time before allows. Weather, drift and soiling are in the placebos; blocks miss what
 * lasts for days.
 *
 * @returns NaN where a side has too few rows.
 */
export function judgedStep(question: JudgedQuestion): JudgedStep {
  const { target, neighbours, sides, clock, atMs } = question
  const known = new Map<number, ComparedSeries>()
  const series = (turbine: number): ComparedSeries => {
    let found = known.get(turbine)
    if (!found) known.set(turbine, (found = question.seriesOf(turbine)))
    return found
  }
  const blocks = question.blocksH.map((hours) =>
    Math.max(1, Math.round((hours * HOUR_MS) / clock.intervalMs)),
  )
  const stepOf = (turbine: number, at: Sides) => {
    const side = sideOf(question.day.length, clock, at)
    const answer = stepWithinCells({ ...series(turbine), cells: question.cells, side, blocks })
    const hours = (rows: number): number => (rows * clock.intervalMs) / HOUR_MS
    const enough =
      hours(answer.rowsBefore) >= LEAST_BEFORE_H &&
      hours(answer.rowsAfter) >= LEAST_AFTER_H &&
      answer.seenShare >= LEAST_SEEN
    return { ...answer, step: enough ? answer.step : NaN, side }
  }
  const own = stepOf(target, sides)
  const counts = {
    rowsBefore: own.rowsBefore,
    rowsAfter: own.rowsAfter,
    daysBefore: daysOf(own.side, -1, question.day, series(target)),
    daysAfter: daysOf(own.side, 1, question.day, series(target)),
  }
  if (Number.isNaN(own.step)) {
    return { step: NaN, halfWidth: NaN, ...counts, placebos: [], spread: NaN }
  }

  const placebos: Placebo[] = []
  let freedom = 0
  const tryAt = (turbines: readonly number[], at: Sides, dateMs: number): void => {
    const scale = Math.sqrt(varianceOf(sides) / varianceOf(at))
    let tried = 0
    for (const turbine of turbines) {
      const { step } = stepOf(turbine, at)
      if (Number.isNaN(step)) continue
      placebos.push({ turbine, atMs: dateMs, step: step * scale })
      tried++
    }
    // Neighbours are compared with each other, so that what they show at one date adds up to nothing.
    freedom += Math.max(0, tried - 1)
  }
  if (neighbours.length >= 2) tryAt(neighbours, sides, atMs)
  for (const date of earlierDates(sides, atMs)) tryAt([target, ...neighbours], date.sides, date.atMs)

  const spread = Math.sqrt(placebos.reduce((sum, { step }) => sum + step * step, 0) / placebos.length)
  const byPlacebo = freedom > 0 ? studentQuantile(0.975, freedom) * spread : NaN
  const halfWidth = byPlacebo >= own.halfWidth || Number.isNaN(own.halfWidth) ? byPlacebo : own.halfWidth
  return { step: own.step, halfWidth, ...counts, placebos, spread }
}

/** -1 before, 1 after, 0 neither. */
export function sideOf(
  length: number,
  clock: { readonly fromMs: number; readonly intervalMs: number },
  sides: Sides,
): Int8Array {
  const side = new Int8Array(length)
  for (let t = 0; t < length; t++) {
    const ms = clock.fromMs + t * clock.intervalMs
    if (ms >= sides.beforeFromMs && ms < sides.beforeToMs) side[t] = -1
    else if (ms >= sides.afterFromMs && ms < sides.afterToMs) side[t] = 1
  }
  return side
}

function daysOf(side: Int8Array, which: number, day: Int32Array, { value, cell }: ComparedSeries): number {
  const days = new Set<number>()
  for (let t = 0; t < side.length; t++) {
    if (side[t] === which && cell[t]! >= 0 && !Number.isNaN(value[t]!)) days.add(day[t]!)
  }
  return days.size
}

/** As far as days are independent and alike: 1 / days before + 1 / days after. */
function varianceOf({ beforeFromMs, beforeToMs, afterFromMs, afterToMs }: Sides): number {
  return DAY_MS / (beforeToMs - beforeFromMs) + DAY_MS / (afterToMs - afterFromMs)
}

/** Dates before the correction with as much time after them as it has, or half the time before where that is less. */
function earlierDates(sides: Sides, atMs: number): { atMs: number; sides: Sides }[] {
  const before = atMs - sides.beforeFromMs
  const gap = atMs - sides.beforeToMs
  const after = Math.min(sides.afterToMs - atMs, before / 2)
  const dates: { atMs: number; sides: Sides }[] = []
  for (let k = 1; k <= DATES; k++) {
    const dateMs = atMs - k * after
    if (dateMs - sides.beforeFromMs < Math.max(after - 1, LEAST_DAYS_BEFORE_DATE * DAY_MS)) break
    if (!(after > 3 * gap)) break
    dates.push({
      atMs: dateMs,
      sides: {
        beforeFromMs: sides.beforeFromMs,
        beforeToMs: dateMs - gap,
        afterFromMs: dateMs + gap,
        afterToMs: Math.min(dateMs + after, sides.beforeToMs),
      },
    })
  }
  return dates
}
