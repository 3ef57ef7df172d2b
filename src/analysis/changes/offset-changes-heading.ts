import { circularMean, wrap180 } from '../../kernel/angle/index.ts'
import { changeInterval, changePoints, meanCost } from '../../kernel/stats/index.ts'
import { farmDirection } from '../neighbours/farm-direction.ts'
import { farmGrid, onGrid, type FarmGrid, type GridChannel } from '../neighbours/farm-grid.ts'
import type { FarmRows } from '../neighbours/neighbours.ts'
import { blockNoise } from './offset-changes-noise.ts'
import { NORMAL_95 } from '../offset/resampled-spread.ts'

/** Length of the bins that are searched. */
const BIN_MS = 6 * 3_600_000
/** Share of the rows due without which a bin says nothing. */
const BIN_SHARE = 0.25
/** A state that lasts less than a day is not told from weather. */
const MIN_BINS = 4
/** Blocks of 6 hours to 4 days: weather sits in a sector for days, and sectors differ. */
const NOISE_BINS = [1, 2, 4, 8, 16] as const
/** Blocks of 10 minutes to 6 hours. */
const NOISE_ROWS = [1, 6, 36] as const
/** Bins to either side in which rows date a change. */
const DATED_WITHIN = 8
/** Smaller steps are left alone: neighbours, terrain and other turbines' steps make them. Degrees. */
const MIN_STEP_DEG = 1.5
/** What a step costs, in variances times ln n: see `bicPenalty`. */
const PENALTY_PARAMETERS = 3
/** Share of a turbine's running bins in which its heading is compared, for its record to count as whole. */
const WHOLE_SHARE = 0.8

/** N + v against the farm steps: n - d changed, and either may have done it. */
export interface HeadingStep {
  /** Start of the first row after the step, epoch ms. */
  readonly atMs: number
  /** 95 %: from the start of the last row surely before it to the end of the first row surely after it, epoch ms. */
  readonly intervalMs: readonly [number, number]
  /** Change of N + v - direction = of n - d, degrees, [-180, 180). */
  readonly sizeDeg: number
  /** Of the size, at 95 %. */
  readonly halfWidthDeg: number
}

export interface HeadingRecord {
  /** In order of time. */
  readonly steps: readonly HeadingStep[]
  /** True: no step can have gone unseen for want of nacelle position or of neighbours. */
  readonly whole: boolean
  /** n - d between the steps, against the farm's direction, which is itself known but for a constant; one more than steps. */
  readonly levels: readonly HeadingLevel[]
  /** What was searched: starts of the bins of six hours, epoch ms, and their n - d, continued over 180 degrees. */
  readonly binMs: Float64Array
  readonly binDeg: Float64Array
  /** Variance of a bin as it counts over days, square degrees; NaN where bins are too few to tell. */
  readonly binVariance: number
}

/** Time with one n - d. */
export interface HeadingLevel {
  readonly fromMs: number
  readonly toMs: number
  /** Degrees, [-180, 180). */
  readonly deg: number
  /** At 95 %; NaN where bins are too few to tell. */
  readonly halfWidthDeg: number
}

/**
 * Steps of each turbine's N + v against the farm's direction, searched in 6-hour medians and dated in rows. A turbine is
 * compared with the median of the others; the clearest steps are taken out first, so that they do not show in the
 * others. Angles are continued from bin to bin: a step may cross 180 degrees. What all turbines do at once is not seen.
 *
 * @param indicated  N + v of each turbine where it is to be heard, on the farm's clock; default: while it runs.
 * @returns per turbine, in the order of the farm; null without nacelle position or with fewer than two others.
 */
export function headingSteps(
  farm: FarmRows,
  grid: FarmGrid = farmGrid(farm),
  indicated: GridChannel = runningDirection(grid),
): (HeadingRecord | null)[] {
  const { consensusDeg, constantDeg } = farmDirection(grid, indicated)
  const local = indicated.map((values, i) =>
    values.map((value, t) => wrap180(value - consensusDeg[t]! - constantDeg[i]!)),
  )
  const bins = binsOf(farm)
  const stepsOf = (cleaned: GridChannel): Found[] => {
    const reference = medianOfOthers(local, cleaned)
    return local.map((values, i) => search(values, reference[i]!, bins))
  }

  const settled = new Set<number>()
  let found = stepsOf(local)
  for (;;) {
    const levelled = found
    found = stepsOf(
      local.map((values, i) => withoutLevels(values, levelled[i]!, { steps: settled.has(i), bins })),
    )
    let clearest = -1
    found.forEach((one, i) => {
      if (one.levels.length > 1 && !settled.has(i) && !(one.gain <= (found[clearest]?.gain ?? 0)))
        clearest = i
    })
    if (clearest < 0) break
    settled.add(clearest)
  }
  return found.map((one, i) => {
    if (one.values.length < 2 * MIN_BINS) return null
    return {
      steps: datedSteps(one, grid, bins),
      whole: one.values.length >= WHOLE_SHARE * runningBins(grid, i, bins),
      levels: levelsIn(one, constantDeg[i]!, grid, bins),
      binMs: Float64Array.from(one.bin, (b) => bins.fromMs + b * bins.rowsPerBin * bins.intervalMs),
      binDeg: one.values.map((value) => value + constantDeg[i]!),
      binVariance: one.noise,
    }
  })
}

/** N + v of every turbine while it runs, [i][t]. */
export function runningDirection(grid: FarmGrid): GridChannel {
  return onGrid(grid, (turbine, row) => (turbine.running[row] === 1 ? turbine.indicatedDirection[row]! : NaN))
}

interface Bins {
  readonly intervalMs: number
  readonly fromMs: number
  readonly rowsPerBin: number
}

/** What the search finds in the bins of one turbine that say something. */
interface Found {
  /** Row by row: heading against the others, degrees, any turn. */
  readonly rows: Float64Array
  /** Bins with rows enough, and their medians, continued over 180 degrees. */
  readonly bin: readonly number[]
  readonly values: Float64Array
  /** Variance of a bin's median as it counts over days. */
  readonly noise: number
  /** Segment k: mean and ends [from, to) as indices into `values`. */
  readonly levels: readonly { from: number; to: number; meanDeg: number }[]
  /** By how much the steps lower the cost, in variances. */
  readonly gain: number
}

function binsOf(farm: FarmRows): Bins {
  const intervalMs = farm.intervalS * 1000
  return { intervalMs, fromMs: farm.fromMs, rowsPerBin: Math.max(1, Math.round(BIN_MS / intervalMs)) }
}

/** Median of what the other turbines show at the same time, [i][t]; NaN with fewer than two others. */
export function medianOfOthers(local: GridChannel, cleaned: GridChannel): GridChannel {
  const k = local.length
  const out = local.map((values) => new Float64Array(values.length).fill(NaN))
  for (let t = 0; t < (local[0]?.length ?? 0); t++) {
    const order: number[] = []
    for (let j = 0; j < k; j++) if (!Number.isNaN(cleaned[j]![t]!)) order.push(j)
    order.sort((a, b) => cleaned[a]![t]! - cleaned[b]![t]!)
    const rank = new Int32Array(k).fill(order.length)
    order.forEach((j, r) => (rank[j] = r))
    for (let i = 0; i < k; i++) {
      const others = order.length - (rank[i]! < order.length ? 1 : 0)
      if (others < 2) continue
      const lower = (others - 1) >> 1
      const upper = others >> 1
      const below = cleaned[order[lower + (lower >= rank[i]! ? 1 : 0)]!]![t]!
      const above = cleaned[order[upper + (upper >= rank[i]! ? 1 : 0)]!]![t]!
      out[i]![t] = (below + above) / 2
    }
  }
  return out
}

function search(own: Float64Array, others: Float64Array, bins: Bins): Found {
  const rows = own.map((value, t) => wrap180(value - others[t]!))
  const bin: number[] = []
  const medians: number[] = []
  for (let b = 0; b * bins.rowsPerBin < rows.length; b++) {
    const inBin = rows.subarray(b * bins.rowsPerBin, (b + 1) * bins.rowsPerBin)
    const { direction, count } = circularMean(inBin)
    if (!(count >= BIN_SHARE * bins.rowsPerBin) || Number.isNaN(direction)) continue
    const before = medians.at(-1) ?? 0
    bin.push(b)
    medians.push(before + wrap180(medianAbout(inBin, direction) - before))
  }
  const values = Float64Array.from(medians)
  const noise = blockNoise(new Float64Array(values.length).fill(1), values, NOISE_BINS)
  const whole = { from: 0, to: values.length, meanDeg: meanOf(values, 0, values.length) }
  if (!(noise > 0)) return { rows, bin, values, noise, levels: [whole], gain: 0 }

  const cost = meanCost(values)
  const penalty = PENALTY_PARAMETERS * Math.log(values.length) * noise
  const changes = [...changePoints(cost, { penalty, minLength: MIN_BINS }).changes]
  let levels = levelsOf(values, changes)
  for (;;) {
    const sizes = levels.slice(1).map((level, k) => Math.abs(wrap180(level.meanDeg - levels[k]!.meanDeg)))
    const least = sizes.indexOf(Math.min(...sizes))
    if (least < 0 || sizes[least]! >= MIN_STEP_DEG) break
    changes.splice(least, 1)
    levels = levelsOf(values, changes)
  }
  const left = levels.reduce((sum, { from, to }) => sum + cost.of(from, to), 0)
  return { rows, bin, values, noise, levels, gain: (cost.of(0, values.length) - left) / noise }
}

/** The lower of two middle values, so that a bin that holds both sides of a step shows one of them and no third. */
function medianAbout(rows: Float64Array, centreDeg: number): number {
  const sorted = rows
    .map((value) => wrap180(value - centreDeg))
    .filter((value) => !Number.isNaN(value))
    .sort()
  return centreDeg + sorted[(sorted.length - 1) >> 1]!
}

function levelsOf(values: Float64Array, changes: readonly number[]): Found['levels'] {
  const ends = [0, ...changes, values.length]
  return ends.slice(1).map((to, k) => ({ from: ends[k]!, to, meanDeg: meanOf(values, ends[k]!, to) }))
}

function meanOf(values: Float64Array, from: number, to: number): number {
  let sum = 0
  for (let i = from; i < to; i++) sum += values[i]!
  return sum / (to - from)
}

/**
 * The series about 0, whatever the turbine's north: else the median of the others would jump when one of them stops.
 * With `steps` every state is moved there, so that its steps do not show in the others; without, the mean of all.
 */
function withoutLevels(
  values: Float64Array,
  found: Found,
  { steps, bins }: { steps: boolean; bins: Bins },
): Float64Array {
  if (found.values.length === 0) return values
  if (!steps) {
    const mean = meanOf(found.values, 0, found.values.length)
    return values.map((value) => wrap180(value - mean))
  }
  const out = new Float64Array(values.length)
  found.levels.forEach((level, k) => {
    const fromRow = k === 0 ? 0 : dated(found, k, bins).at
    const toRow = found.levels[k + 1] ? dated(found, k + 1, bins).at : values.length
    for (let t = fromRow; t < toRow; t++) out[t] = wrap180(values[t]! - level.meanDeg)
  })
  return out
}

function datedSteps(found: Found, grid: FarmGrid, bins: Bins): HeadingStep[] {
  const timeOf = (row: number): number => bins.fromMs + row * bins.intervalMs
  return found.levels.slice(1).map((level, k) => {
    const before = found.levels[k]!
    const { at, low, high } = dated(found, k + 1, bins)
    const bins1 = before.to - before.from
    const bins2 = level.to - level.from
    return {
      atMs: timeOf(at),
      intervalMs: [timeOf(low), timeOf(Math.min(high + 1, grid.length))] as const,
      sizeDeg: wrap180(level.meanDeg - before.meanDeg),
      halfWidthDeg: NORMAL_95 * Math.sqrt(found.noise * (1 / bins1 + 1 / bins2)),
    }
  })
}

function levelsIn(found: Found, constantDeg: number, grid: FarmGrid, bins: Bins): HeadingLevel[] {
  const timeOf = (row: number): number => bins.fromMs + row * bins.intervalMs
  const starts = found.levels.map((_, k) => (k === 0 ? 0 : dated(found, k, bins).at))
  return found.levels.map(({ from, to, meanDeg }, k) => ({
    fromMs: timeOf(starts[k]!),
    toMs: timeOf(starts[k + 1] ?? grid.length),
    deg: wrap180(meanDeg + constantDeg),
    halfWidthDeg: NORMAL_95 * Math.sqrt(found.noise / (to - from)),
  }))
}

/** The row at which segment k begins, and the ends of its interval: the last row before it, the first row after it. */
function dated(found: Found, k: number, bins: Bins): { at: number; low: number; high: number } {
  const before = found.levels[k - 1]!
  const after = found.levels[k]!
  const fromBin = found.bin[Math.max(before.from, after.from - DATED_WITHIN)]!
  const toBin = found.bin[Math.min(after.to, after.from + DATED_WITHIN) - 1]!
  const middle = (before.meanDeg + after.meanDeg) / 2
  const row: number[] = []
  const values: number[] = []
  const last = Math.min(found.rows.length, (toBin + 1) * bins.rowsPerBin)
  for (let t = fromBin * bins.rowsPerBin; t < last; t++) {
    const value = wrap180(found.rows[t]! - middle)
    if (Number.isNaN(value)) continue
    row.push(t)
    values.push(value)
  }
  const scale = blockNoise(new Float64Array(values.length).fill(1), values, NOISE_ROWS)
  const place = changeInterval(meanCost(values), {
    from: 0,
    to: values.length,
    scale: Number.isNaN(scale) ? 0 : scale,
  })
  return { at: row[place.change]!, low: row[place.low - 1]!, high: row[place.high]! }
}

function runningBins(grid: FarmGrid, i: number, bins: Bins): number {
  const turbine = grid.turbines[i]!
  let count = 0
  for (let b = 0; b * bins.rowsPerBin < grid.length; b++) {
    let running = 0
    for (let t = b * bins.rowsPerBin; t < Math.min(grid.length, (b + 1) * bins.rowsPerBin); t++) {
      const row = grid.row[i]![t]!
      if (row >= 0 && turbine.running[row] === 1) running++
    }
    if (running >= BIN_SHARE * bins.rowsPerBin) count++
  }
  return count
}
