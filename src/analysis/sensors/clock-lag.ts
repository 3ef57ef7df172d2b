import { medianOf, studentQuantile } from '../../kernel/stats/index.ts'
import type { Frame } from '../../frame/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'

/** Clocks that are off by more are not looked for, s. */
const LONGEST_LAG_S = 3 * 3600
/** Rows of seconds are averaged to this first: gusts are each turbine's own, s. */
const SHORTEST_STEP_S = 600
/** Each stretch of the window is judged for itself, so that a clock that jumps half-way is seen; days. */
const STRETCH_DAYS = 7
/** Lags of less than this many steps are the time that wind takes across a farm. */
const LEAST_STEPS = 0.6
/** Fewer turbines than this have no majority. */
const FEWEST_TURBINES = 3
/** Correlation at the best lag, and how far it must exceed that at no lag. */
const LEAST_CORRELATION = 0.2
const LEAST_GAIN = 0.1
/** Chance that one lag of one turbine beats lag 0 by accident, one side; some 40 lags are tried. */
const CHANCE = 1e-4
/** Fewer pairs than this decide nothing: not quite three days of ten minutes. */
const FEW_PAIRS = 400
/** Pairs of the test's blocks: six hours of ten minutes. */
const BLOCK_STEPS = 36

type SensorFinding = TurbineSheet['sensors'][number]

/** A clock that is off over a stretch of the window. */
export interface ClockLag {
  readonly fromMs: number
  readonly toMs: number
  /** Positive: the turbine's stamps are late, its clock runs ahead of the others'; s. */
  readonly lagS: number
  /** Correlation of the changes of wind speed at that lag, and without any. */
  readonly correlation: number
  readonly correlationAtZero: number
}

/**
 * Turbines whose clock is off against the others', from changes of wind speed, which a farm shares: they are compared with
 * the mean of the others at lags of up to three hours, week by week. A lag counts when it beats none in block after block of
 * six hours. The turbine that stands out most is left out of the mean and the rest is judged again, so that one bad clock
 * does not speak against good ones. A shift that the whole farm shares cannot be seen.
 *
 * @returns one list per turbine, in order; empty for farms of fewer than three turbines.
 */
export function clockLags(frame: Frame): SensorFinding[][] {
  return clockLagsOf(frame).map((lags) => lags.map(findingOf))
}

/** As {@link clockLags}, in numbers. */
export function clockLagsOf(frame: Frame): ClockLag[][] {
  const lags: ClockLag[][] = frame.turbines.map(() => [])
  if (frame.turbines.length < FEWEST_TURBINES) return lags
  const stepMs = Math.max(frame.intervalS, SHORTEST_STEP_S) * 1000
  const changes = changesOnGrid(frame, stepMs)
  const beside = frame.turbines.map(({ time }) => besideGridS(time, frame, stepMs))
  const usual = medianOf(beside)
  const steps = changes[0]!.length
  const stretch = Math.round((STRETCH_DAYS * 86_400_000) / stepMs)
  // A rest shorter than half a stretch goes with the last one.
  const stretches = Math.max(1, Math.round(steps / stretch))
  for (let s = 0; s < stretches; s++) {
    const from = s * stretch
    const to = s === stretches - 1 ? steps : from + stretch
    for (const [k, found] of judgeStretch(changes, from, to, stepMs)) {
      append(
        lags[k]!,
        {
          ...found,
          lagS: found.lagS + beside[k]! - usual,
          fromMs: frame.fromMs + from * stepMs,
          toMs: Math.min(frame.toMs, frame.fromMs + to * stepMs),
        },
        stepMs,
      )
    }
  }
  return lags
}

/** Stretches with the same lag become one. */
function append(list: ClockLag[], next: ClockLag, stepMs: number): void {
  const last = list[list.length - 1]
  const continues =
    last !== undefined && last.toMs === next.fromMs && Math.abs(last.lagS - next.lagS) < stepMs / 2000
  if (!continues) {
    list.push(next)
    return
  }
  const weight = (last.toMs - last.fromMs) / (next.toMs - last.fromMs)
  const mean = (a: number, b: number): number => weight * a + (1 - weight) * b
  list[list.length - 1] = {
    fromMs: last.fromMs,
    toMs: next.toMs,
    lagS: mean(last.lagS, next.lagS),
    correlation: mean(last.correlation, next.correlation),
    correlationAtZero: mean(last.correlationAtZero, next.correlationAtZero),
  }
}

/** Change of the wind speed against the step before, on a clock that all turbines share, m/s; NaN where either is missing. */
function changesOnGrid(frame: Frame, stepMs: number): Float64Array[] {
  const steps = Math.max(1, Math.ceil((frame.toMs - frame.fromMs) / stepMs))
  return frame.turbines.map(({ time, windSpeed }) => {
    const sum = new Float64Array(steps)
    const count = new Float64Array(steps)
    for (let i = 0; i < time.length; i++) {
      // Stamps may stand a little off the grid: the start of a row belongs to the nearest step of its length.
      const at =
        frame.intervalS * 1000 === stepMs
          ? Math.round((time[i]! - frame.fromMs) / stepMs)
          : Math.floor((time[i]! - frame.fromMs) / stepMs)
      if (!(at >= 0 && at < steps) || Number.isNaN(windSpeed[i]!)) continue
      sum[at]! += windSpeed[i]!
      count[at]!++
    }
    const speed = sum.map((total, at) => total / count[at]!) // 0 / 0: missing
    return speed.map((value, at) => value - (speed[at - 1] ?? NaN))
  })
}

/** How far a turbine's rows usually start after the step of the grid that they are put in, s; 0 for rows of seconds. */
function besideGridS(time: Float64Array, frame: Frame, stepMs: number): number {
  if (frame.intervalS * 1000 !== stepMs) return 0
  const beside = medianOf(
    time.map((at) => at - frame.fromMs - stepMs * Math.round((at - frame.fromMs) / stepMs)),
  )
  return (Number.isNaN(beside) ? 0 : beside) / 1000
}

type Found = Omit<ClockLag, 'fromMs' | 'toMs'>

function judgeStretch(
  changes: readonly Float64Array[],
  from: number,
  to: number,
  stepMs: number,
): Map<number, Found> {
  const found = new Map<number, Found>()
  const n = changes.length
  const sum = new Float64Array(to - from)
  const count = new Float64Array(to - from)
  const include = (series: Float64Array, sign: 1 | -1): void => {
    for (let t = from; t < to; t++) {
      const change = series[t]!
      if (Number.isNaN(change)) continue
      sum[t - from]! += sign * change
      count[t - from]! += sign
    }
  }
  for (const series of changes) include(series, 1)
  // More than a third off, and nobody knows whose clock is right.
  for (let round = 0; round < Math.ceil(n / 3); round++) {
    let worst = -1
    let worstLag: (Found & { gain: number }) | null = null
    for (let k = 0; k < n; k++) {
      if (found.has(k)) continue
      const own = changes[k]!.subarray(from, to)
      const others = sum.map((total, t) => {
        const mine = Number.isNaN(own[t]!) ? 0 : 1
        return count[t]! - mine >= 1 ? (total - (mine ? own[t]! : 0)) / (count[t]! - mine) : NaN
      })
      const lag = lagAgainst(own, others, stepMs)
      if (lag && lag.gain > (worstLag?.gain ?? 0)) {
        worst = k
        worstLag = lag
      }
    }
    if (!worstLag) break
    include(changes[worst]!, -1)
    found.set(worst, {
      lagS: worstLag.lagS,
      correlation: worstLag.correlation,
      correlationAtZero: worstLag.correlationAtZero,
    })
  }
  return found
}

/** The lag at which a series fits the others best, where that is not 0 and no accident; else null. */
function lagAgainst(
  own: Float64Array,
  others: Float64Array,
  stepMs: number,
): (Found & { gain: number }) | null {
  const reach = Math.floor((LONGEST_LAG_S * 1000) / stepMs)
  const correlations = new Float64Array(2 * reach + 1)
  for (let lag = -reach; lag <= reach; lag++) correlations[lag + reach] = correlationAt(own, others, lag)
  let best = reach
  for (let k = 0; k < correlations.length; k++) if (correlations[k]! > (correlations[best]! || -1)) best = k
  const at = best - reach
  const correlation = correlations[best]!
  const correlationAtZero = correlations[reach]!
  const gain = correlation - correlationAtZero
  if (at === 0 || !(correlation >= LEAST_CORRELATION) || !(gain >= LEAST_GAIN)) return null
  const exact = at + vertex(correlations[best - 1], correlation, correlations[best + 1])
  if (!(Math.abs(exact) >= LEAST_STEPS) || !beatsZero(own, others, at)) return null
  return { lagS: (exact * stepMs) / 1000, correlation, correlationAtZero, gain }
}

function correlationAt(own: Float64Array, others: Float64Array, lag: number): number {
  let xy = 0
  let xx = 0
  let yy = 0
  let pairs = 0
  for (let t = Math.max(0, lag); t < own.length && t - lag < own.length; t++) {
    const x = own[t]!
    const y = others[t - lag]!
    if (Number.isNaN(x) || Number.isNaN(y)) continue
    xy += x * y
    xx += x * x
    yy += y * y
    pairs++
  }
  return pairs >= FEW_PAIRS ? xy / Math.sqrt(xx * yy) : NaN
}

/** Top of the parabola through three points a step apart, in steps from the middle one, -1/2 to 1/2; 0 at an edge. */
function vertex(before: number | undefined, top: number, after: number | undefined): number {
  const left = before ?? NaN
  const right = after ?? NaN
  const bend = left - 2 * top + right
  if (!(bend < 0)) return 0
  return Math.max(-0.5, Math.min(0.5, (left - right) / (2 * bend)))
}

/** Whether the lag fits better than none in block after block. */
function beatsZero(own: Float64Array, others: Float64Array, lag: number): boolean {
  const gains: number[] = []
  for (let start = 0; start < own.length; start += BLOCK_STEPS) {
    let gain = 0
    let size = 0
    let othersSize = 0
    for (let t = start; t < Math.min(start + BLOCK_STEPS, own.length); t++) {
      const x = own[t]!
      const shifted = others[t - lag] ?? NaN
      const plain = others[t]!
      if (Number.isNaN(x) || Number.isNaN(shifted) || Number.isNaN(plain)) continue
      gain += x * (shifted - plain)
      size += x * x
      othersSize += (plain * plain + shifted * shifted) / 2
    }
    const scale = Math.sqrt(size * othersSize)
    if (scale > 0) gains.push(gain / scale) // a gusty day weighs no more than a calm one
  }
  const n = gains.length
  if (n < 3) return false
  const mean = gains.reduce((sum, gain) => sum + gain, 0) / n
  const variance = gains.reduce((sum, gain) => sum + (gain - mean) ** 2, 0) / (n - 1)
  return mean / Math.sqrt(variance / n) > studentQuantile(1 - CHANCE, n - 1)
}

function findingOf(lag: ClockLag): SensorFinding {
  const minutes = Math.round(Math.abs(lag.lagS) / 60)
  const side = lag.lagS > 0 ? 'ahead of' : 'behind'
  return {
    sensor: 'clock',
    kind: 'clock-off',
    finding: `the clock runs about ${minutes} minutes ${side} the other turbines: changes of wind speed fit theirs at that lag (correlation ${lag.correlation.toFixed(2)}, without it ${lag.correlationAtZero.toFixed(2)})`,
    severity: 'warn',
    howSure: 'likely',
    checkFirst:
      'At the desk: compare the clock of this turbine’s controller and logger with the time server of the site.',
    from: new Date(lag.fromMs).toISOString(),
    to: new Date(lag.toMs).toISOString(),
    detail: { lagS: lag.lagS, correlation: lag.correlation, correlationAtZero: lag.correlationAtZero },
  }
}
