import { unwrap } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { HeadingRecord } from '../changes/offset-changes-heading.ts'

/** What one more change costs, in variances times ln n: as in the search for steps. */
const PENALTY_PARAMETERS = 3
/** Shorter slips are steps, days. */
const SHORTEST_SLIP_MS = 4 * 86_400_000
/** Smaller ones are left alone, degrees. */
const LEAST_SLIP_DEG = 3
/** Faster ones are steps that a bin or two holds both sides of, degrees a day. */
const FASTEST_SLIP_DEG_DAY = 3
/** Beginnings and ends of a slip that are tried. */
const KNOTS = 60
/** Twice the log-likelihood by which travel must explain a slip better than time. */
const DECIDED = 8
/** Range of a position that is wound over more than a turn, degrees: only its travel can be added up. */
const WOUND_DEG = 400
/** Share of the travel that is lost, from which it is told. */
const LEAST_LOST = 0.005
/** A nacelle moves by less between two rows than this, degrees, or its travel is not known. */
const LONGEST_MOVE_DEG = 170

/** A north that slips slowly. */
export interface SlowSlip {
  /** time: with the days; travel: with the degrees turned, either way; position: in proportion to where the nacelle stands. */
  readonly with: 'time' | 'travel' | 'position'
  readonly fromMs: number
  readonly toMs: number
  readonly sizeDeg: number
  readonly degPerDay: number
  /** Degrees lost for each degree turned; null for a slip with time. */
  readonly perDegree: number | null
  /** Index of the first and last step of the record that it stands for; none where last < first. */
  readonly firstStep: number
  readonly lastStep: number
}

/**
 * Steps that are no steps: a north that slips on slowly is cut into stairs by the search for steps. Each run of steps in one
 * direction is held against one slope, by the same account of what a change costs; and the slope in time against one in travel.
 */
export function slowSlips(turbine: TurbineFrame, record: HeadingRecord): SlowSlip[] {
  const { binMs, binDeg, binVariance, steps } = record
  const n = binDeg.length
  if (!(binVariance > 0) || n < 16) return []
  const penalty = PENALTY_PARAMETERS * Math.log(n) * binVariance
  const travel = travelAt(turbine, binMs)
  const whole = asLostPulses(record, travel, penalty)
  if (whole) return [whole]
  const ends = [0, ...steps.map(({ atMs }) => firstAtOrAfter(binMs, atMs)), n]
  const slips: SlowSlip[] = []
  for (let first = 0; first < steps.length;) {
    let last = first
    while (
      last + 1 < steps.length &&
      Math.sign(steps[last + 1]!.sizeDeg) === Math.sign(steps[first]!.sizeDeg)
    )
      last++
    const slip = asSlope(record, ends, first, last, { penalty, turned: travel.turnedDeg })
    if (slip) slips.push(slip)
    first = last + 1
  }
  return slips
}

function asSlope(
  { binMs, binDeg, binVariance }: HeadingRecord,
  ends: readonly number[],
  first: number,
  last: number,
  { penalty, turned }: { penalty: number; turned: Float64Array },
): SlowSlip | null {
  const from = ends[first]!
  const to = ends[last + 2]!
  let stairs = 0
  for (let k = first; k <= last + 1; k++) stairs += squaresAboutMean(binDeg, ends[k]!, ends[k + 1]!)
  const stride = Math.max(1, Math.floor((to - from) / KNOTS))
  let best: { squares: number; size: number; t0: number; t1: number } | null = null
  for (let t0 = from; t0 < to - 2; t0 += stride) {
    for (let t1 = to - 1; t1 > t0; t1 -= stride) {
      if (binMs[t1]! - binMs[t0]! < SHORTEST_SLIP_MS) break
      const fit = fitRamp(binDeg, binMs, from, to, t0, t1)
      if (!best || fit.squares < best.squares) best = { ...fit, t0, t1 }
    }
  }
  if (!best || !(Math.abs(best.size) >= LEAST_SLIP_DEG)) return null
  if (!(best.squares + 2 * penalty < stairs + (last - first + 1) * penalty)) return null
  const { t0, t1 } = best
  const days = (binMs[t1]! - binMs[t0]!) / 86_400_000
  if (!(Math.abs(best.size) <= FASTEST_SLIP_DEG_DAY * days)) return null
  const byTravel = fitRamp(binDeg, turned, from, to, t0, t1)
  const lost = byTravel.size / (turned[t1]! - turned[t0]!)
  const isTravel = byTravel.squares < best.squares - DECIDED * binVariance
  return {
    with: isTravel ? 'travel' : 'time',
    fromMs: binMs[t0]!,
    toMs: binMs[t1]!,
    sizeDeg: best.size,
    degPerDay: best.size / days,
    perDegree: isTravel ? lost : null,
    firstStep: first,
    lastStep: last,
  }
}

/** Level, then a slope along x from t0 to t1, then level again: by least squares. */
function fitRamp(
  values: Float64Array,
  x: Float64Array,
  from: number,
  to: number,
  t0: number,
  t1: number,
): { squares: number; size: number } {
  const start = x[t0]!
  const span = x[t1]! - start
  if (!(span > 0)) return { squares: Infinity, size: 0 }
  let sx = 0
  let sy = 0
  let sxx = 0
  let sxy = 0
  let syy = 0
  const origin = values[from]!
  for (let k = from; k < to; k++) {
    const ramp = Math.max(0, Math.min(1, (x[k]! - start) / span))
    const y = values[k]! - origin
    sx += ramp
    sy += y
    sxx += ramp * ramp
    sxy += ramp * y
    syy += y * y
  }
  const n = to - from
  const spread = sxx - (sx * sx) / n
  const joint = sxy - (sx * sy) / n
  return { squares: syy - (sy * sy) / n - (joint * joint) / spread, size: joint / spread }
}

function squaresAboutMean(values: Float64Array, from: number, to: number): number {
  let mean = 0
  for (let k = from; k < to; k++) mean += values[k]!
  mean /= to - from
  let squares = 0
  for (let k = from; k < to; k++) squares += (values[k]! - mean) ** 2
  return squares
}

function firstAtOrAfter(times: Float64Array, ms: number): number {
  const at = times.findIndex((time) => time >= ms)
  return at < 0 ? times.length : at
}

interface Travel {
  /** Degrees turned either way since the start, at each bin. */
  readonly turnedDeg: Float64Array
  /** Position, not wrapped, at each bin; null for a scale of one turn. */
  readonly woundDeg: Float64Array | null
}

function travelAt(turbine: TurbineFrame, binMs: Float64Array): Travel {
  const { time, nacellePosition } = turbine
  const path = unwrap(nacellePosition)
  let low = Infinity
  let high = -Infinity
  for (const position of nacellePosition) {
    if (position < low) low = position
    if (position > high) high = position
  }
  const turnedDeg = new Float64Array(binMs.length)
  const wound = new Float64Array(binMs.length)
  let turned = 0
  let last = NaN
  let bin = 0
  let reading = NaN
  for (let i = 0; i < time.length && bin < binMs.length; i++) {
    while (bin < binMs.length && time[i]! >= binMs[bin]!) {
      turnedDeg[bin] = turned
      wound[bin++] = reading
    }
    const at = path[i]!
    if (Number.isNaN(at)) continue
    const move = Math.abs(at - last)
    if (move < LONGEST_MOVE_DEG) turned += move
    last = at
    reading = nacellePosition[i]!
  }
  for (; bin < binMs.length; bin++) {
    turnedDeg[bin] = turned
    wound[bin] = reading
  }
  return { turnedDeg, woundDeg: high - low > WOUND_DEG ? wound : null }
}

/**
 * A counter that misses pulses both ways reads too little of every turn: n - d then goes with the wound position itself. What
 * the place of the compass does (terrain) is taken out on both sides.
 */
function asLostPulses(record: HeadingRecord, travel: Travel, penalty: number): SlowSlip | null {
  const { binMs, binDeg, steps } = record
  const wound = travel.woundDeg
  if (!wound || steps.length === 0) return null
  const rows: number[] = []
  for (let k = 0; k < binDeg.length; k++) if (!Number.isNaN(wound[k]!)) rows.push(k)
  if (rows.length < 16) return null
  const compass = (k: number): number[] => [
    1,
    Math.sin((wound[k]! * Math.PI) / 180),
    Math.cos((wound[k]! * Math.PI) / 180),
  ]
  const asPulses = leastSquares(
    rows.map((k) => [...compass(k), wound[k]! / 360]),
    rows.map((k) => binDeg[k]!),
  )
  const levelOf = (k: number): number => steps.filter(({ atMs }) => binMs[k]! >= atMs).length
  const asStairs = leastSquares(
    rows.map((k) => [...compass(k), ...steps.map((_, s) => (levelOf(k) > s ? 1 : 0))]),
    rows.map((k) => binDeg[k]!),
  )
  if (!asPulses || !asStairs) return null
  const perDegree = asPulses.solution[3]! / 360
  if (!(Math.abs(perDegree) >= LEAST_LOST)) return null
  if (!(asPulses.squares + penalty < asStairs.squares + steps.length * penalty)) return null
  const known = rows.map((k) => wound[k]!)
  const sizeDeg = perDegree * (Math.max(...known) - Math.min(...known))
  return {
    with: 'position',
    fromMs: binMs[0]!,
    toMs: binMs.at(-1)!,
    sizeDeg,
    degPerDay: NaN,
    perDegree,
    firstStep: 0,
    lastStep: steps.length - 1,
  }
}

/** Ordinary least squares by the normal equations, for a handful of columns; null when they hang together. */
function leastSquares(
  rows: readonly (readonly number[])[],
  y: readonly number[],
): { solution: number[]; squares: number } | null {
  const k = rows[0]!.length
  const table = Array.from({ length: k }, () => new Float64Array(k + 1))
  rows.forEach((row, r) => {
    for (let i = 0; i < k; i++) {
      for (let j = 0; j < k; j++) table[i]![j]! += row[i]! * row[j]!
      table[i]![k]! += row[i]! * y[r]!
    }
  })
  for (let i = 0; i < k; i++) {
    let pivot = i
    for (let j = i + 1; j < k; j++) if (Math.abs(table[j]![i]!) > Math.abs(table[pivot]![i]!)) pivot = j
    ;[table[i], table[pivot]] = [table[pivot]!, table[i]!]
    if (!(Math.abs(table[i]![i]!) > 1e-9)) return null
    for (let j = 0; j < k; j++) {
      if (j === i) continue
      const factor = table[j]![i]! / table[i]![i]!
      for (let c = i; c <= k; c++) table[j]![c]! -= factor * table[i]![c]!
    }
  }
  const solution = table.map((row, i) => row[k]! / row[i]!)
  const squares = rows.reduce(
    (sum, row, r) => sum + (y[r]! - row.reduce((total, value, i) => total + value * solution[i]!, 0)) ** 2,
    0,
  )
  return { solution, squares }
}
