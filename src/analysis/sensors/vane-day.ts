import { circularMedian, wrap180 } from '../../kernel/angle/index.ts'
import { frozenRuns, yawMoves } from '../../kernel/motion/index.ts'
import { medianOf, quantileOf, robustSd } from '../../kernel/stats/index.ts'
import type { HighRateRows } from '../high-rate/high-rate-rows.ts'
import { angleStep, codeCounts } from './vane-codes.ts'

/** From this wind speed on a vane turns, m/s. Common practice, no source. */
const WIND_MOVES_MS = 3
/** A vane that keeps one value for less is not called frozen, s. */
const FROZEN_S = 120
/** Chance that a healthy day shows a frozen spell; the length is tripled on top, since gusts and lulls hang together. */
const CHANCE = 1e-4
const LULL_FACTOR = 3
/** Readings this far from those around, which agree with each other, are spikes: degrees, and times the usual noise. */
const SPIKE_DEG = 40
const SPIKE_NOISES = 8
const AGREE_DEG = 12
const AROUND = 4
const SPIKE_SAMPLES = 2
/** Rows further apart show no spikes and no leading vane, s. */
const SLOWEST_S = 10
/** The vane before a move is its mean over so long, s. */
const BEFORE_S = 60
const MINUTE_ROWS = 60
const FINEST_BITS = 10
const THIN = 10
export const VISIT_BINS = 180

/** What one day of high-rate rows tells of a vane: small, and joined day by day. */
export interface VaneDay {
  /** Readings of the day. */
  readonly readings: number
  /** Step of the readings, degrees; NaN = none found. `bits`: of an encoder, 0 = none. */
  readonly stepDeg: number
  readonly bits: number
  /** Readings by code, length 2^bits; empty without an encoder's step, or with one of more than 10 bits. */
  readonly codes: Float64Array
  /** Entries into bins of two degrees, the first at -180; length 180. */
  readonly visits: Float64Array
  /** Noise from reading to reading in the quietest tenth of the minutes, SD in degrees; NaN with few readings. */
  readonly noiseFloorDeg: number
  /** Spells of one value in wind: start, end (epoch ms), value (degrees), air temperature (degrees C). */
  readonly frozen: readonly { fromMs: number; toMs: number; valueDeg: number; airTemperatureC: number }[]
  /** Jumps away and back within two readings, and the rows that were looked at. */
  readonly spikes: number
  readonly spikeRows: number
  readonly largestSpikeDeg: number
  /** Yaw moves, and the vane before them signed by their direction: sum and sum of squares, degrees. */
  readonly moves: number
  readonly leadSum: number
  readonly leadSquares: number
}

/** Looks at the vane of one turbine and day. Only what is said of yaw moves leans on the nacelle position. */
export function vaneDay(rows: HighRateRows): VaneDay {
  const { first, end } = rows
  const vane = rows.vane.subarray(first, end)
  const step = angleStep(vane)
  const bits = step.bits !== null && step.bits <= FINEST_BITS ? step.bits : 0
  const noise = noiseOf(vane)
  return {
    readings: vane.reduce((sum, value) => sum + (Number.isNaN(value) ? 0 : 1), 0),
    stepDeg: step.stepDeg,
    bits,
    codes: bits > 0 ? codeCounts(vane, step.stepDeg) : new Float64Array(0),
    visits: visitsOf(vane),
    noiseFloorDeg: noise.floorDeg,
    frozen: frozenOf(rows),
    ...spikesOf(rows, noise.usualDeg),
    ...leadOf(rows),
  }
}

/** SD of the noise from reading to reading: of a usual minute, and of the quietest tenth. */
function noiseOf(vane: Float64Array): { usualDeg: number; floorDeg: number } {
  const minutes: number[] = []
  for (let from = 0; from + MINUTE_ROWS <= vane.length; from += MINUTE_ROWS) {
    let squares = 0
    let pairs = 0
    for (let i = from + 1; i < from + MINUTE_ROWS; i++) {
      const change = wrap180(vane[i]! - vane[i - 1]!)
      if (Number.isNaN(change)) continue
      squares += change * change
      pairs++
    }
    if (pairs >= MINUTE_ROWS / 2) minutes.push(Math.sqrt(squares / pairs / 2))
  }
  return { usualDeg: medianOf(minutes), floorDeg: quantileOf(minutes, 0.1) }
}

/** Every tenth reading: neighbours by the second tell little more, and sorting them takes most of the time. */
function thinned(values: Float64Array): Float64Array {
  return values.filter((_, i) => i % THIN === 0)
}

function visitsOf(vane: Float64Array): Float64Array {
  const visits = new Float64Array(VISIT_BINS)
  let last = -1
  for (const value of vane) {
    if (Number.isNaN(value)) continue
    const bin = Math.min(VISIT_BINS - 1, Math.floor((value + 180) / (360 / VISIT_BINS)))
    if (bin !== last) visits[bin]!++
    last = bin
  }
  return visits
}

function frozenOf({
  vane,
  timeMs,
  windSpeed,
  airTemperature,
  sampleS,
  first,
  end,
}: HighRateRows): VaneDay['frozen'] {
  const within = 0.01 * robustSd(thinned(vane.subarray(first, end))) || 0
  let pairs = 0
  let equal = 0
  for (let i = first + 1; i < end; i++) {
    const change = Math.abs(vane[i]! - vane[i - 1]!)
    if (!(windSpeed[i]! >= WIND_MOVES_MS) || Number.isNaN(change)) continue
    pairs++
    if (change <= 2 * within) equal++
  }
  // A day that is frozen throughout tells nothing of chance: the 10-minute rows of the whole log judge it.
  const share = equal / pairs
  if (!(share < 0.95) || !(sampleS > 0)) return []
  const byChance = share > 0 ? (LULL_FACTOR * Math.log(CHANCE / pairs)) / Math.log(share) : 2
  const least = Math.max(2, Math.ceil(FROZEN_S / sampleS), Math.ceil(byChance))
  const runs = frozenRuns(vane, least, within)
  const found: VaneDay['frozen'][number][] = []
  for (let k = 0; k < runs.start.length; k++) {
    const from = runs.start[k]!
    const to = from + runs.length[k]!
    // What begins before the day belongs to the day before.
    if (from < first || from >= end || timeMs[to - 1]! - timeMs[from]! > 2 * runs.length[k]! * sampleS * 1000)
      continue
    if (!(medianOf(windSpeed.subarray(from, to)) >= WIND_MOVES_MS)) continue
    found.push({
      fromMs: timeMs[from]!,
      toMs: timeMs[to - 1]! + sampleS * 1000,
      valueDeg: vane[from]!,
      airTemperatureC: medianOf(airTemperature.subarray(from, to)),
    })
  }
  return found
}

function spikesOf(
  { vane, windSpeed, running, sampleS, first, end }: HighRateRows,
  noiseDeg: number,
): Pick<VaneDay, 'spikes' | 'spikeRows' | 'largestSpikeDeg'> {
  let spikes = 0
  let spikeRows = 0
  let largestSpikeDeg = 0
  const least = Math.max(SPIKE_DEG, SPIKE_NOISES * noiseDeg)
  if (!(sampleS <= SLOWEST_S && least > 0)) return { spikes, spikeRows, largestSpikeDeg }
  for (let i = Math.max(first, AROUND); i < Math.min(end, vane.length - AROUND - SPIKE_SAMPLES); i++) {
    if (running[i] !== 1 || !(windSpeed[i]! >= WIND_MOVES_MS + 1)) continue
    spikeRows++
    if (!(Math.abs(wrap180(vane[i]! - vane[i - 1]!)) > 0.7 * least)) continue
    const around: number[] = []
    for (let j = 1; j <= AROUND; j++) around.push(vane[i - j]!, vane[i + SPIKE_SAMPLES - 1 + j]!)
    if (around.some((value) => Number.isNaN(value))) continue
    const centre = circularMedian(around)
    const off = Math.abs(wrap180(vane[i]! - centre))
    if (
      !(off > least) ||
      !around.every((value) => Math.abs(wrap180(value - centre)) <= AGREE_DEG + 2 * noiseDeg)
    )
      continue
    spikes++
    largestSpikeDeg = Math.max(largestSpikeDeg, off)
  }
  return { spikes, spikeRows, largestSpikeDeg }
}

function leadOf(rows: HighRateRows): Pick<VaneDay, 'moves' | 'leadSum' | 'leadSquares'> {
  const { timeMs, vane, nacellePosition, running, sampleS, dayMs, first, end } = rows
  const sums = { moves: 0, leadSum: 0, leadSquares: 0 }
  if (!(sampleS <= SLOWEST_S) || nacellePosition.every((value) => Number.isNaN(value))) return sums
  const timeS = timeMs.map((ms) => (ms - dayMs) / 1000)
  const usual = medianOf(
    thinned(vane.subarray(first, end).map((value, i) => (running[first + i] === 1 ? value : NaN))),
  )
  const moves = yawMoves(timeS, nacellePosition, { leastTravelDeg: 2 })
  const before = Math.round(BEFORE_S / sampleS)
  moves.start.forEach((start, k) => {
    if (start < first || start >= end || running[start] !== 1 || start < before) return
    const lead = medianOf(vane.subarray(start - before, start)) - usual
    if (Number.isNaN(lead)) return
    const signed = lead * Math.sign(moves.travelDeg[k]!)
    sums.moves++
    sums.leadSum += signed
    sums.leadSquares += signed * signed
  })
  return sums
}
