import { codesVisited } from '../../kernel/motion/index.ts'
import { medianOf } from '../../kernel/stats/index.ts'

/** Steps that vanes and loggers have, degrees: codes of 3 to 14 bits, and decimals. */
const BINARY_STEPS = Array.from({ length: 12 }, (_, k) => 360 / 2 ** (k + 3))
const DECIMAL_STEPS = [10, 5, 2, 1, 0.5, 0.2, 0.1, 0.05, 0.02, 0.01, 0.005, 0.002, 0.001]
/** Share of readings that must lie on a grid. */
const ON_GRID_SHARE = 0.98
/** A grid this fine against the decimals of the log is matched by anything. */
const LEAST_DECIMALS = 5
const FEW_VALUES = 60
const FEW_CODES = 4
/** What scaling leaves, degrees. */
const ROUNDING_DEG = 1e-6

/** The step of an angle's readings. */
export interface AngleStep {
  /** Degrees; NaN = no grid found. */
  readonly stepDeg: number
  /** 360 / 2^bits = step; null for a decimal step. */
  readonly bits: number | null
  /** The decimals of the log, as a step in degrees. */
  readonly decimalsDeg: number
  readonly codes: number
}

/**
 * The coarsest usual step that nearly all readings lie on: of an encoder (360 / 2^n), else of the decimals of the log.
 *
 * @param values  single readings, not means: means of a stepped sensor have no step. NaN = missing.
 */
export function angleStep(values: Float64Array): AngleStep {
  const visited = codesVisited(values)
  const none = { stepDeg: NaN, bits: null, decimalsDeg: NaN, codes: visited.codes.length }
  if (visited.samples < FEW_VALUES || visited.codes.length < FEW_CODES) return none
  const share = (stepDeg: number, within: number): number => {
    let on = 0
    visited.codes.forEach((code, k) => {
      if (Math.abs(code - stepDeg * Math.round(code / stepDeg)) <= within) on += visited.counts[k]!
    })
    return on / visited.samples
  }
  const decimalsDeg = DECIMAL_STEPS.find((step) => share(step, ROUNDING_DEG) >= ON_GRID_SHARE) ?? NaN
  const within = (Number.isNaN(decimalsDeg) ? 0 : decimalsDeg / 2) + ROUNDING_DEG
  for (const [k, stepDeg] of BINARY_STEPS.entries()) {
    if (stepDeg < LEAST_DECIMALS * decimalsDeg || stepDeg <= decimalsDeg) break
    const turned = new Set([...visited.codes].map((code) => Math.round(code / stepDeg)))
    if (turned.size >= FEW_CODES && share(stepDeg, within) >= ON_GRID_SHARE)
      return { stepDeg, bits: k + 3, decimalsDeg, codes: turned.size }
  }
  return { stepDeg: decimalsDeg, bits: null, decimalsDeg, codes: visited.codes.length }
}

/** How often each code of a turn was read: entry k = readings at k steps, length 360 / step. */
export function codeCounts(values: Float64Array, stepDeg: number): Float64Array {
  const codes = Math.round(360 / stepDeg)
  const counts = new Float64Array(codes)
  for (const value of values) {
    if (Number.isNaN(value)) continue
    counts[((Math.round(value / stepDeg) % codes) + codes) % codes]!++
  }
  return counts
}

/** A bit that never changes though the codes around those that it forbids are common. */
export interface StuckBit {
  /** Counted from 0 = finest, of a binary word; in a Gray word the same picture is made by the bit one below. */
  readonly binaryBit: number
  readonly gaps: number
  /** Readings that the forbidden codes would have by their neighbours, and those that they have. */
  readonly expected: number
  readonly seen: number
}

const GAP_EXPECTED = 10
const ALL_EXPECTED = 40
const SEEN_SHARE = 0.02
const FEWEST_GAPS = 2

/**
 * Looks for blocks of 2^b codes that are missing by turns with blocks that are visited, at any zero: bit b of a binary word
 * that stands still, or bit b - 1 of a Gray word. The finest bit of a binary word makes the step twice as wide instead.
 *
 * @param counts  readings by code, length 2^n.
 */
export function stuckBit(counts: Float64Array): StuckBit | null {
  const codes = counts.length
  let best: StuckBit | null = null
  for (let bit = 0; 2 ** (bit + 1) <= codes / 2; bit++) {
    const width = 2 ** bit
    for (let phase = 0; phase < 2 * width; phase++) {
      const found = gapsOf(counts, width, phase)
      if (found.gaps < FEWEST_GAPS || found.expected < ALL_EXPECTED) continue
      if (found.seen > SEEN_SHARE * found.expected) continue
      if (found.expected > (best?.expected ?? 0)) best = { binaryBit: bit, ...found }
    }
  }
  return best
}

function gapsOf(
  counts: Float64Array,
  width: number,
  phase: number,
): { gaps: number; expected: number; seen: number } {
  const codes = counts.length
  let gaps = 0
  let expected = 0
  let seen = 0
  for (let start = phase; start < codes + phase; start += 2 * width) {
    const at = (k: number): number => counts[(k + codes) % codes]!
    let inside = 0
    for (let k = start; k < start + width; k++) inside += at(k)
    seen += inside
    const level = Math.min(at(start - 1), at(start + width))
    if (level * width >= GAP_EXPECTED) {
      gaps++
      expected += level * width
    }
  }
  return { gaps, expected, seen }
}

/** A sector that is never read though the angles on both sides of it are. */
export interface DeadSector {
  readonly fromDeg: number
  readonly toDeg: number
  /** Visits that the sector would have by its sides. */
  readonly expected: number
}

const SIDE_BINS = 4
const SIDE_VISITS = 5
const SECTOR_EXPECTED = 30
const NARROWEST_BINS = 2

/**
 * The widest stretch of bins without a visit whose sides were both visited often.
 *
 * @param visits  entries into each bin of a turn, the first at -180 degrees.
 */
export function deadSector(visits: Float64Array): DeadSector | null {
  const bins = visits.length
  const binDeg = 360 / bins
  let best: DeadSector | null = null
  for (let start = 0; start < bins; start++) {
    const at = (k: number): number => visits[(k + 2 * bins) % bins]!
    if (at(start) > 0 || at(start - 1) === 0) continue
    let width = 1
    while (width < bins && at(start + width) === 0) width++
    if (width < NARROWEST_BINS || width > bins / 4) continue
    const side = (from: number): number => medianOf(Array.from({ length: SIDE_BINS }, (_, k) => at(from + k)))
    const level = Math.min(side(start - SIDE_BINS), side(start + width))
    const expected = level * width
    if (!(level >= SIDE_VISITS && expected >= SECTOR_EXPECTED) || expected <= (best?.expected ?? 0)) continue
    const fromDeg = -180 + start * binDeg
    best = { fromDeg, toDeg: fromDeg + width * binDeg, expected }
  }
  return best
}
