import { circularMean, wrap180 } from '../kernel/angle/index.ts'
import { resampledSlopes, studentQuantile, type DayWeights } from '../kernel/stats/index.ts'
import { powerAt } from '../kernel/wind/index.ts'
import type { TurbineFrame } from '../frame/index.ts'
import type { ScoringSettings, TurbineSheet } from '../sheet/index.ts'
import { fitOffset } from './offset-fit.ts'
import { offsetRows, type OffsetRows } from './offset-rows.ts'
import type { Block } from './readiness.ts'
import { runningBelowRated } from './vane-statistics.ts'

const DEG_PER_RAD = 180 / Math.PI
/** Exponents shown side by side: a low field value, the disk rule, and the cos-cubed rule. */
export const SHOWN_EXPONENTS = [1.4, 2, 3] as const
const NORMAL_95 = 1.959963984540054
/**
 * Slow vane noise that the rotor does not feel flattens power against vane, so that m comes out too small by 2 to 9 %
 * (measured on simulated farms). Without a second vane its size is not known: half-width as a share of |m|.
 */
const DILUTION_SHARE = 0.05
const BIN_DEG = 2

export interface StaticOffsetRequest {
  readonly settings: ScoringSettings
  /** Blocks of 1, 2 and 4 days over the calendar of the farm; the same for all its turbines. */
  readonly dayWeights: readonly DayWeights[]
  readonly days: number
}

/** The offset, and why there is none. */
export interface StaticOffsetAnswer {
  readonly sheet: TurbineSheet['staticOffset']
  /** d and m for each exponent shown, and for the one in force. */
  readonly byExponent: readonly { exponent: number; offsetDeg: number; standingDeg: number }[]
  /** What the sheet's estimate means, for the questions that build on it; null = no estimate. */
  readonly standing: {
    readonly offsetDeg: number
    readonly standingDeg: number
    readonly standingInterval95Deg: readonly [number, number]
  } | null
  readonly failure: { code: string; text: string } | null
}

/**
 * The static offset d from power against vane, and the standing misalignment m = d + mean vane, each with a 95 % interval.
 *
 * Days, not rows, are taken as independent: whole days are resampled in blocks of 1, 2 and 4, the levels refitted in each
 * resample; the widest of the three half-widths counts, with a t quantile for the number of blocks. To it come, as the
 * root of the sum of squares, what an unknown response of the anemometer would shift, and what slow vane noise may hide.
 *
 * @param block  a sensor that forbids an estimate, if any.
 * @returns null in the sheet, with `failure`, when there are too few rows or days, the vane does not vary, or a sensor blocks.
 */
export function staticOffset(
  frame: TurbineFrame,
  request: StaticOffsetRequest,
  block: Block | null = null,
): StaticOffsetAnswer {
  const { settings, dayWeights, days } = request
  const rows = offsetRows(frame, days)
  const usedDays = new Set(rows.day).size
  const counts = { rows: rows.vane.length, days: usedDays }
  const vane = vaneByDay(frame, days)

  const failure = block ?? tooLittle(rows, usedDays, settings)
  if (failure) return unanswered(frame, counts, failure)

  const known = settings.assumedResponsePctPerDeg
  const responsePerDeg = (known ?? 0) / 100
  const fit = fitOffset(rows, { exponent: settings.exponent, responsePerDeg })
  if (!fit.converged) {
    return unanswered(frame, counts, { code: 'no-fit', text: 'the fit of power against vane did not settle' })
  }
  const statistical = dayWeights
    .map((weights) => halfWidths(resampledSlopes(fit.sums, weights), vane, weights, usedDays))
    .reduce((widest, next) => (next.standing > widest.standing ? next : widest))
  const response =
    known === null
      ? (NORMAL_95 * settings.responseSpreadPctPerDeg * Math.abs(fit.perResponse) * DEG_PER_RAD) / 100
      : 0

  const offsetDeg = wrap180(fit.offset * DEG_PER_RAD - rows.centreDeg)
  const standingDeg = wrap180(offsetDeg + vane.meanDeg)
  const dilution = DILUTION_SHARE * Math.abs(standingDeg)
  const half = Math.hypot(statistical.offset, response, dilution)
  const standingHalf = Math.hypot(statistical.standing, response, dilution)
  const byExponent = SHOWN_EXPONENTS.map((exponent) => {
    const shown =
      exponent === settings.exponent
        ? fit
        : fitOffset(rows, { exponent, responsePerDeg }, { offset: fit.offset, noise: fit.noise })
    const shownDeg = shown.converged ? wrap180(shown.offset * DEG_PER_RAD - rows.centreDeg) : NaN
    return { exponent, offsetDeg: shownDeg, standingDeg: wrap180(shownDeg + vane.meanDeg) }
  })
  const further = furtherDays(
    standingDeg,
    { statistical: statistical.standing, fixed: response },
    usedDays,
    settings,
  )
  const method = 'power against vane, own anemometer'
  const leansOn =
    known === null
      ? `the anemometer's response to the vane is not known: taken as 0 +- ${settings.responseSpreadPctPerDeg} % per degree`
      : `the anemometer's response to the vane is taken as known: ${known} % per degree`
  return {
    failure: null,
    byExponent,
    standing: {
      offsetDeg,
      standingDeg,
      standingInterval95Deg: [standingDeg - standingHalf, standingDeg + standingHalf],
    },
    sheet: {
      ...emptySheet(frame, counts),
      estimateDeg: offsetDeg,
      interval95Deg: [offsetDeg - half, offsetDeg + half],
      standingMisalignmentDeg: standingDeg,
      standingInterval95Deg: [standingDeg - standingHalf, standingDeg + standingHalf],
      intervalParts: {
        statistical: statistical.standing,
        response,
        exponent: 0,
        instrument: 0,
        dilution: null,
      },
      method,
      estimates: [
        {
          method,
          estimateDeg: offsetDeg,
          interval95Deg: [offsetDeg - half, offsetDeg + half],
          leansOn,
          kind: 'slope',
          ...counts,
        },
      ],
      byExponent: byExponent.map((shown) => ({
        exponent: shown.exponent,
        estimateDeg: shown.offsetDeg,
        standingMisalignmentDeg: shown.standingDeg,
      })),
      furtherDays: further.days,
      furtherNote: further.note,
      bins: powerByVane(frame),
    },
  }
}

function unanswered(
  frame: TurbineFrame,
  counts: { rows: number; days: number },
  failure: { code: string; text: string },
): StaticOffsetAnswer {
  const furtherNote =
    failure.code === 'too-few-rows' || failure.code === 'too-few-days'
      ? `${failure.text}; post a month of this turbine, or add a reference instrument`
      : ''
  return { sheet: { ...emptySheet(frame, counts), furtherNote }, byExponent: [], standing: null, failure }
}

function tooLittle(
  rows: OffsetRows,
  usedDays: number,
  settings: ScoringSettings,
): StaticOffsetAnswer['failure'] {
  const n = rows.vane.length
  if (n < settings.minimumRows) {
    return {
      code: 'too-few-rows',
      text: `${n} rows can be used, at least ${settings.minimumRows} are needed`,
    }
  }
  if (usedDays < settings.minimumDays) {
    return {
      code: 'too-few-days',
      text: `used rows lie on ${usedDays} ${usedDays === 1 ? 'day' : 'days'}, at least ${settings.minimumDays} are needed: days, not rows, are independent`,
    }
  }
  return null
}

interface VaneByDay {
  readonly meanDeg: number
  readonly sin: Float64Array
  readonly cos: Float64Array
}

/** Sums per day of the running vane below rated: its mean turns d into m. */
function vaneByDay(frame: TurbineFrame, days: number): VaneByDay {
  const sin = new Float64Array(days)
  const cos = new Float64Array(days)
  const angles: number[] = []
  for (const i of runningBelowRated(frame)) {
    const angle = frame.vane[i]! / DEG_PER_RAD
    sin[frame.day[i]!]! += Math.sin(angle)
    cos[frame.day[i]!]! += Math.cos(angle)
    angles.push(frame.vane[i]!)
  }
  return { meanDeg: wrap180(circularMean(angles).direction), sin, cos }
}

/** Half-widths at 95 %, degrees, of d and of m from one set of resamples. */
function halfWidths(
  deviations: Float64Array,
  vane: VaneByDay,
  weights: DayWeights,
  usedDays: number,
): { offset: number; standing: number } {
  const blocks = usedDays / weights.blockDays
  if (!(blocks >= 2)) return { offset: NaN, standing: -Infinity } // too few blocks of this length to say anything
  const standing = new Float64Array(deviations.length)
  for (let r = 0; r < deviations.length; r++) {
    let sin = 0
    let cos = 0
    for (let d = 0; d < weights.days; d++) {
      const times = weights.counts[r * weights.days + d]!
      sin += times * vane.sin[d]!
      cos += times * vane.cos[d]!
    }
    const meanDeg = Math.atan2(sin, cos) * DEG_PER_RAD
    standing[r] = deviations[r]! * DEG_PER_RAD + wrap180(meanDeg - vane.meanDeg)
  }
  // A bootstrap over B blocks spreads as (B - 1) / B of the true variance.
  const factor = studentQuantile(0.975, blocks - 1) * Math.sqrt(blocks / (blocks - 1))
  return { offset: factor * spreadOf(deviations) * DEG_PER_RAD, standing: factor * spreadOf(standing) }
}

/** SD of resampled values; NaN (a resample without variation) is left out. */
function spreadOf(values: Float64Array): number {
  let n = 0
  let mean = 0
  let squares = 0
  for (const value of values) {
    if (Number.isNaN(value)) continue
    n++
    const delta = value - mean
    mean += delta / n
    squares += delta * (value - mean)
  }
  return n > 1 ? Math.sqrt(squares / (n - 1)) : NaN
}

/**
 * How many more days would give a verdict, from half-width^2 = A^2 / days + B^2: A the statistical part, B what days do not shrink.
 */
function furtherDays(
  standingDeg: number,
  half: { statistical: number; fixed: number },
  days: number,
  settings: ScoringSettings,
): { days: number | null; note: string } {
  const threshold = settings.actionThresholdDeg
  const size = Math.abs(standingDeg)
  const needed = size < threshold ? threshold - size : size - threshold / 2
  const now = Math.hypot(half.statistical, half.fixed)
  if (now <= needed) return { days: null, note: 'no more days are needed for this verdict' }
  if (half.fixed >= needed) {
    return {
      days: null,
      note: 'more days will not settle it; a reference instrument, neighbours or a month of rows at 1 Hz would',
    }
  }
  const total = (half.statistical ** 2 * days) / (needed ** 2 - half.fixed ** 2)
  const further = Math.ceil(total - days)
  if (further > 730)
    return {
      days: null,
      note: 'the offset lies so close to the threshold that no practical number of days will settle it',
    }
  return { days: further, note: `about ${further} more days of such data would settle it` }
}

/** Power over the measured curve by vane, rows used for the offset. */
function powerByVane(frame: TurbineFrame): TurbineSheet['staticOffset']['bins'] {
  const groups = new Map<number, number[]>()
  for (let i = 0; i < frame.time.length; i++) {
    if (frame.reason[i] !== 0) continue
    const bin = Math.floor((frame.vane[i]! + BIN_DEG / 2) / BIN_DEG)
    const ratio = frame.power[i]! / powerAt(frame.curve, frame.normalisedSpeed[i]!)
    const group = groups.get(bin)
    if (group) group.push(ratio)
    else groups.set(bin, [ratio])
  }
  return [...groups]
    .sort(([a], [b]) => a - b)
    .map(([bin, ratios]) => {
      const mean = ratios.reduce((sum, ratio) => sum + ratio, 0) / ratios.length
      return {
        vaneFromDeg: bin * BIN_DEG - BIN_DEG / 2,
        vaneToDeg: bin * BIN_DEG + BIN_DEG / 2,
        rows: ratios.length,
        relativePowerMean: mean,
        relativePowerSd: spreadOf(Float64Array.from(ratios)),
      }
    })
}

function emptySheet(
  frame: TurbineFrame,
  counts: { rows: number; days: number },
): TurbineSheet['staticOffset'] {
  return {
    estimateDeg: null,
    interval95Deg: [null, null],
    standingMisalignmentDeg: null,
    standingInterval95Deg: [null, null],
    intervalParts: { statistical: null, response: null, exponent: null, instrument: null, dilution: null },
    method: null,
    estimates: [],
    byExponent: [],
    changes: [],
    signChecked: frame.setup.vane?.sign !== undefined,
    vaneLogged: frame.setup.vane?.logged ?? 'unknown',
    furtherDays: null,
    furtherNote: '',
    ...counts,
    bins: [],
  }
}
