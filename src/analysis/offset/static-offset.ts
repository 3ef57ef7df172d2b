import { DEG_PER_RAD, wrap180 } from '../../kernel/angle/index.ts'
import type { DayWeights } from '../../kernel/stats/index.ts'
import { correctSpeed, type TurbineFrame } from '../../frame/index.ts'
import type { ScoringSettings, TurbineSheet } from '../../sheet/index.ts'
import type { TurbineResponse } from '../neighbours/anemometer-response.ts'
import { exponentDoubt, withExponentDoubt } from './exponent-doubt.ts'
import { fittedExponent } from './fitted-exponent.ts'
import { furtherDays } from './further-days.ts'
import { disagree, type FarmEstimate } from '../neighbours/farm-estimates.ts'
import { fitOffset, offsetAtExponent } from './offset-fit.ts'
import { offsetByCondition } from './offset-by-condition.ts'
import { offsetSpread, vaneByDay } from './offset-interval.ts'
import { offsetRows, type OffsetRows } from './offset-rows.ts'
import { captureMatrix, powerAgainstVane } from './power-against-vane-table.ts'
import { powerByVane } from './power-by-vane.ts'
import type { Block } from '../sensors/readiness.ts'
import { conditionsInSheet, exponentInSheet, NO_CONDITIONS } from './offset-in-sheet.ts'
import { NORMAL_95 } from './resampled-spread.ts'

/** Exponents shown side by side: a low field value, the disk rule, and the cos-cubed rule. */
export const SHOWN_EXPONENTS = [1.4, 2, 3] as const
/** The estimate that takes the anemometer's response from a setting. */
export const OWN_ANEMOMETER = 'power against vane, own anemometer'
/**
 * Slow vane noise that the rotor does not feel flattens power against vane, so that m comes out too small by 2 to 9 %
 * (measured on simulated farms). Without a second vane its size is not known: half-width as a share of |m|.
 */
const DILUTION_SHARE = 0.05

export interface StaticOffsetRequest {
  readonly settings: ScoringSettings
  /** Blocks of 1, 2 and 4 days over the calendar of the farm; the same for all its turbines. */
  readonly dayWeights: readonly DayWeights[]
  readonly days: number
  /** What the neighbours tell of this anemometer's response; null or absent: nothing. */
  readonly response?: TurbineResponse | null
  /** Estimates that lean on neighbours, to stand beside this one. */
  readonly farmEstimates?: readonly FarmEstimate[]
  /** Per row of the frame: 1 = free stream, 0 = in or beside a wake; null or absent: not known. */
  readonly freeStream?: Uint8Array | null
}

/** The static offset as the sheet shows it, but for what is said of entering it. */
export type OffsetSheet = Omit<TurbineSheet['staticOffset'], 'entry'>

/** The offset, and why there is none. */
export interface StaticOffsetAnswer {
  readonly sheet: OffsetSheet
  /** d and m for each exponent shown, and for the one in force. */
  readonly byExponent: readonly { exponent: number; offsetDeg: number; standingDeg: number }[]
  /** The frame with wind speeds corrected for the response in force, for the questions that build on it. */
  readonly frame: TurbineFrame
  /** That response, relative change of wind speed per degree of vane. */
  readonly responsePerDeg: number
  /** Estimates that differ beyond chance; null = none. */
  readonly disagreement: string | null
  /** What the sheet's estimate means, for the questions that build on it; null = no estimate. */
  readonly standing: {
    readonly offsetDeg: number
    readonly standingDeg: number
    readonly standingInterval95Deg: readonly [number, number]
    /** Were the exponent in force known to be the true one. */
    readonly standingInterval95GivenExponentDeg: readonly [number, number]
    /** Exponents that the ends of standingInterval95Deg go with. */
    readonly endExponents: readonly [number, number]
    /** Of a vane that reads k degrees for each degree, d / k^2 (slope of power) or d / k (yaw moves, reference) is found. */
    readonly gainInEstimate: 1 | 2
  } | null
  readonly failure: { code: string; text: string } | null
}

/**
 * The static offset d from power against vane, and the standing misalignment m = d + mean vane, each with a 95 % interval.
 *
 * Days, not rows, are taken as independent: whole days are resampled in blocks of 1, 2 and 4, the levels refitted in each
 * resample; the widest of the three half-widths counts, with a t quantile for the number of blocks. To it come, as the
 * root of the sum of squares, what is not known of the anemometer's response, and what slow vane noise may hide. What is
 * not known of the exponent then moves the ends, mostly away from 0.
 *
 * @param block  a sensor that forbids an estimate, if any.
 * @returns null in the sheet, with `failure`, when there are too few rows or days, the vane does not vary, or a sensor blocks.
 */
export function staticOffset(
  asRead: TurbineFrame,
  request: StaticOffsetRequest,
  block: Block | null = null,
): StaticOffsetAnswer {
  const { settings, dayWeights, days } = request
  const anemometer = responseInForce(request)
  const frame = correctSpeed(asRead, anemometer.perDeg, settings.vaneMaxDeg)
  const rows = offsetRows(frame, days)
  const usedDays = new Set(rows.day).size
  const counts = { rows: rows.vane.length, days: usedDays }

  const failure = block ?? tooLittle(rows, usedDays, settings)
  if (failure) return unanswered(frame, anemometer.perDeg, counts, failure)

  const model = { exponent: settings.exponent, responsePerDeg: 0 }
  const fit = fitOffset(rows, model)
  if (!fit.converged) {
    return unanswered(frame, anemometer.perDeg, counts, {
      code: 'no-fit',
      text: 'the fit of power against vane did not settle',
    })
  }
  const vane = vaneByDay(frame, days)
  const statistical = offsetSpread(fit, vane, dayWeights, usedDays)
  const response = NORMAL_95 * Math.abs(fit.perResponse) * DEG_PER_RAD * anemometer.sdPerDeg

  const offsetDeg = wrap180(fit.offset * DEG_PER_RAD - rows.centreDeg)
  const standingDeg = wrap180(offsetDeg + vane.meanDeg)
  const dilution = DILUTION_SHARE * Math.abs(standingDeg)
  const offsetHalf = Math.hypot(statistical.offset, response, dilution)
  const standingHalf = Math.hypot(statistical.standing, response, dilution)
  const doubt = exponentDoubt(settings)
  const doubted = withExponentDoubt(standingDeg, standingHalf, doubt)
  // An exponent scales m, whichever way the mean vane is taken off to get d.
  const intervalOf = (ofDeg: number, half: number): [number, number] => {
    const [low, high] = withExponentDoubt(wrap180(ofDeg + vane.meanDeg), half, doubt).interval
    const shift = ofDeg - wrap180(ofDeg + vane.meanDeg)
    return [low + shift, high + shift]
  }
  const interval = intervalOf(offsetDeg, offsetHalf)

  const byExponent = SHOWN_EXPONENTS.map((exponent) => {
    if (exponent === settings.exponent) return { exponent, offsetDeg, standingDeg }
    const shownDeg = wrap180(
      offsetAtExponent(rows, exponent, fit, settings.exponent) * DEG_PER_RAD - rows.centreDeg,
    )
    return { exponent, offsetDeg: shownDeg, standingDeg: wrap180(shownDeg + vane.meanDeg) }
  })
  // Neighbours' comparison shrinks with days; a response that is only bounded by a setting does not.
  const shrinking = anemometer.measured ? Math.hypot(statistical.standing, response) : statistical.standing
  const fixed = anemometer.measured ? dilution : Math.hypot(response, dilution)
  const further = furtherDays(standingDeg, { shrinking, fixed }, usedDays, {
    thresholdDeg: settings.actionThresholdDeg,
    doubt,
  })
  const method = anemometer.measured
    ? 'power against vane, own anemometer corrected for its response'
    : OWN_ANEMOMETER
  // All of them read the same power with the same exponent, which therefore cannot part them.
  const own = { offsetDeg, halfWidthDeg: offsetHalf }
  const others = request.farmEstimates ?? []
  const apart = others.filter((other) => disagree(own, other))
  return {
    failure: null,
    frame,
    responsePerDeg: anemometer.perDeg,
    byExponent,
    disagreement:
      apart.length === 0
        ? null
        : `estimates differ beyond chance: ${method} ${offsetDeg.toFixed(1)}, ` +
          apart.map((other) => `${other.method} ${other.offsetDeg.toFixed(1)}`).join(', '),
    standing: {
      offsetDeg,
      standingDeg,
      standingInterval95Deg: doubted.interval,
      standingInterval95GivenExponentDeg: around(standingDeg, standingHalf),
      endExponents: doubted.endExponents,
      gainInEstimate: 2,
    },
    sheet: {
      ...emptySheet(frame, counts),
      estimateDeg: offsetDeg,
      interval95Deg: interval,
      interval95GivenExponentDeg: around(offsetDeg, offsetHalf),
      standingMisalignmentDeg: standingDeg,
      standingInterval95Deg: [...doubted.interval],
      standingInterval95GivenExponentDeg: around(standingDeg, standingHalf),
      intervalParts: {
        statistical: statistical.standing,
        response,
        exponent: doubted.part,
        instrument: 0,
        dilution,
      },
      method,
      estimates: [
        {
          method,
          estimateDeg: offsetDeg,
          interval95Deg: interval,
          interval95GivenExponentDeg: around(offsetDeg, offsetHalf),
          leansOn: anemometer.text,
          kind: 'slope' as const,
          ...counts,
        },
        ...others.map((other) => ({
          method: other.method,
          estimateDeg: other.offsetDeg,
          interval95Deg: intervalOf(other.offsetDeg, other.halfWidthDeg),
          interval95GivenExponentDeg: around(other.offsetDeg, other.halfWidthDeg),
          leansOn: other.leansOn,
          kind: 'slope' as const,
          rows: other.rows,
          days: other.days,
        })),
      ],
      byExponent: byExponent.map((shown) => ({
        exponent: shown.exponent,
        estimateDeg: shown.offsetDeg,
        standingMisalignmentDeg: shown.standingDeg,
      })),
      furtherDays: further.days,
      furtherNote: further.note,
      bins: powerByVane(frame),
      fittedExponent: exponentInSheet(fittedExponent(rows, fit, dayWeights, usedDays)),
      byCondition: conditionsInSheet(
        offsetByCondition(frame, { rows, fit, dayWeights, freeStream: request.freeStream ?? undefined }),
      ),
    },
  }
}

function around(centre: number, half: number): [number, number] {
  return [centre - half, centre + half]
}

/** The response that the fit takes: a stated one, else what neighbours tell, else none with the setting's spread. */
function responseInForce({ settings, response }: StaticOffsetRequest): {
  perDeg: number
  sdPerDeg: number
  measured: TurbineResponse | null
  text: string
} {
  const known = settings.assumedResponsePctPerDeg
  if (known !== null) {
    return {
      perDeg: known / 100,
      sdPerDeg: 0,
      measured: null,
      text: `the anemometer's response to the vane is taken as known: ${known} % per degree`,
    }
  }
  if (response) {
    const pct = (value: number): string => (100 * value).toFixed(3)
    return {
      perDeg: response.perDeg,
      sdPerDeg: response.sdPerDeg,
      measured: response,
      text:
        `the anemometer's response to the vane, from ${response.rows} intervals against its neighbours: ` +
        `${pct(response.perDeg)} +- ${pct(response.sdPerDeg)} % per degree`,
    }
  }
  return {
    perDeg: 0,
    sdPerDeg: settings.responseSpreadPctPerDeg / 100,
    measured: null,
    text: `the anemometer's response to the vane is not known: taken as 0 +- ${settings.responseSpreadPctPerDeg} % per degree`,
  }
}

function unanswered(
  frame: TurbineFrame,
  responsePerDeg: number,
  counts: { rows: number; days: number },
  failure: { code: string; text: string },
): StaticOffsetAnswer {
  const furtherNote =
    failure.code === 'too-few-rows' || failure.code === 'too-few-days'
      ? `${failure.text}; post a month of this turbine, or add a reference instrument`
      : ''
  return {
    sheet: { ...emptySheet(frame, counts), furtherNote },
    frame,
    responsePerDeg,
    byExponent: [],
    disagreement: null,
    standing: null,
    failure,
  }
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
      text: `${n} ${n === 1 ? 'row' : 'rows'} can be used, at least ${settings.minimumRows} are needed`,
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

function emptySheet(frame: TurbineFrame, counts: { rows: number; days: number }): OffsetSheet {
  return {
    estimateDeg: null,
    interval95Deg: [null, null],
    interval95GivenExponentDeg: [null, null],
    standingMisalignmentDeg: null,
    standingInterval95Deg: [null, null],
    standingInterval95GivenExponentDeg: [null, null],
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
    fittedExponent: null,
    byCondition: NO_CONDITIONS,
    powerAgainstVane: powerAgainstVane(frame),
    captureMatrix: captureMatrix(frame),
  }
}
