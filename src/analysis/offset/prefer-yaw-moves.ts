import { wrap180 } from '../../kernel/angle/index.ts'
import type { DayWeights } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import type { HighRateRecord } from '../high-rate/examine-day.ts'
import { indexAtOrAfter } from '../high-rate/high-rate-rows.ts'
import { disagree } from '../neighbours/farm-estimates.ts'
import { exponentDoubt, withExponentDoubt } from './exponent-doubt.ts'
import { furtherDays } from './further-days.ts'
import { meanVaneSpread, vaneByDay } from './offset-interval.ts'
import { SHOWN_EXPONENTS, type StaticOffsetAnswer } from './static-offset.ts'
import { steepnessByPower, yawMoveOffset, type YawMoveOffset } from './yaw-move-offset.ts'
import { yawMoveRowsWhere, type YawMoveRows } from './yaw-move-windows.ts'

export interface YawMovesRequest {
  readonly settings: ScoringSettings
  readonly dayWeights: readonly DayWeights[]
  readonly days: number
  /** Whether neighbours tell this anemometer's response. */
  readonly hasNeighbours: boolean
}

/**
 * Puts what yaw moves tell of the offset beside the other estimates, or in front where the turbine is alone: they need neither
 * anemometer nor neighbours. In front they stand only with the narrower interval. As they lean on other things than the
 * estimates by wind speed, a difference beyond chance is told.
 *
 * @param answer    of the frame's rows since the last change.
 * @param highRate  null: the log holds no high-rate rows, and the answer stays as it is.
 */
export function preferYawMoves(
  answer: StaticOffsetAnswer,
  highRate: HighRateRecord | null,
  request: YawMovesRequest,
): StaticOffsetAnswer {
  const { frame } = answer
  const rows = highRate && yawMoveRowsOf(highRate, frame)
  if (!rows || rows.startMs.length === 0) return answer
  const { settings, dayWeights, days, hasNeighbours } = request
  const moves = yawMoveOffset(rows, {
    exponent: settings.exponent,
    ratedPowerKw: frame.ratedPowerKw,
    steepnessAtPower: steepnessByPower(frame.curve),
    dayWeights,
    minimumDays: settings.minimumDays,
  })
  const counts = { rows: moves.moves, days: moves.days }
  if (moves.failure !== null) {
    const refused = {
      method: moves.method,
      estimateDeg: null,
      interval95Deg: [null, null],
      interval95GivenExponentDeg: [null, null],
      leansOn: `not used: ${moves.failure}`,
      kind: 'slope' as const,
      ...counts,
    }
    return { ...answer, sheet: { ...answer.sheet, estimates: [...answer.sheet.estimates, refused] } }
  }
  const vane = vaneByDay(frame, days)
  const { offsetDeg, halfWidthDeg } = moves
  const standingDeg = wrap180(offsetDeg + vane.meanDeg)
  const standingHalf = Math.hypot(halfWidthDeg, meanVaneSpread(vane, dayWeights, moves.days))
  const doubt = exponentDoubt(settings)
  const doubted = withExponentDoubt(standingDeg, standingHalf, doubt)
  const [low, high] = withExponentDoubt(standingDeg, halfWidthDeg, doubt).interval
  const interval = [low + offsetDeg - standingDeg, high + offsetDeg - standingDeg]
  const given = around(offsetDeg, halfWidthDeg)
  const estimate = {
    method: moves.method,
    estimateDeg: offsetDeg,
    interval95Deg: interval,
    interval95GivenExponentDeg: [...given],
    leansOn: leaningOf(moves),
    kind: 'slope' as const,
    ...counts,
  }
  const { standing } = answer
  const standingHalfNow = standing ? halfOf(standing.standingInterval95GivenExponentDeg) : Infinity
  // All of them read the same power with the same exponent, which therefore cannot part them.
  const apart =
    standing !== null &&
    disagree(
      { offsetDeg, halfWidthDeg },
      { offsetDeg: standing.offsetDeg, halfWidthDeg: halfOf(answer.sheet.interval95GivenExponentDeg) },
    )
  const disagreement = apart
    ? `estimates differ beyond chance: ${moves.method} ${offsetDeg.toFixed(1)}, ${answer.sheet.method ?? ''} ${standing.offsetDeg.toFixed(1)}`
    : answer.disagreement
  if (hasNeighbours || !(standingHalf < standingHalfNow)) {
    const estimates = [...answer.sheet.estimates, estimate]
    return { ...answer, disagreement, sheet: { ...answer.sheet, estimates } }
  }
  const byExponent = [...SHOWN_EXPONENTS].map((exponent) => {
    // Power shows p m.
    const scaledDeg = wrap180((standingDeg * settings.exponent) / exponent)
    return { exponent, offsetDeg: wrap180(scaledDeg - vane.meanDeg), standingDeg: scaledDeg }
  })
  const further = furtherDays(standingDeg, { shrinking: standingHalf, fixed: 0 }, moves.days, {
    thresholdDeg: settings.actionThresholdDeg,
    doubt,
  })
  const standingGiven = around(standingDeg, standingHalf)
  return {
    ...answer,
    failure: null,
    disagreement,
    byExponent,
    standing: {
      offsetDeg,
      standingDeg,
      standingInterval95Deg: doubted.interval,
      standingInterval95GivenExponentDeg: standingGiven,
      endExponents: doubted.endExponents,
      gainInEstimate: 1,
    },
    sheet: {
      ...answer.sheet,
      estimateDeg: offsetDeg,
      interval95Deg: interval,
      interval95GivenExponentDeg: [...given],
      standingMisalignmentDeg: standingDeg,
      standingInterval95Deg: [...doubted.interval],
      standingInterval95GivenExponentDeg: [...standingGiven],
      intervalParts: {
        statistical: standingHalf,
        response: 0,
        exponent: doubted.part,
        instrument: 0,
        dilution: 0,
      },
      method: moves.method,
      estimates: [estimate, ...answer.sheet.estimates],
      byExponent: byExponent.map((shown) => ({
        exponent: shown.exponent,
        estimateDeg: shown.offsetDeg,
        standingMisalignmentDeg: shown.standingDeg,
      })),
      furtherDays: further.days,
      furtherNote: further.note,
      ...counts,
    },
  }
}

/** Moves of all days that begin inside the frame, each on its calendar day. */
export function yawMoveRowsOf({ days }: HighRateRecord, frame: TurbineFrame): YawMoveRows {
  const lengthMs = frame.intervalS * 1000
  const dayOf = (startMs: number): number => {
    const at = indexAtOrAfter(frame.time, startMs - lengthMs + 1)
    return frame.time[at]! <= startMs ? frame.day[at]! : -1
  }
  const all = days.map(({ moves }) => {
    const day = moves.startMs.map(dayOf)
    return yawMoveRowsWhere({ ...moves, day }, (i) => day[i]! >= 0)
  })
  return {
    startMs: all.flatMap(({ startMs }) => startMs),
    day: all.flatMap(({ day }) => day),
    travelDeg: all.flatMap(({ travelDeg }) => travelDeg),
    logPower: all.flatMap(({ logPower }) => logPower),
    logPowerGain: all.flatMap(({ logPowerGain }) => logPowerGain),
    vaneBeforeDeg: all.flatMap(({ vaneBeforeDeg }) => vaneBeforeDeg),
    vaneAfterDeg: all.flatMap(({ vaneAfterDeg }) => vaneAfterDeg),
    pathDeg: all.flatMap(({ pathDeg }) => pathDeg),
  }
}

function leaningOf({ leansOn, moves, clockwise, rests }: YawMoveOffset): string {
  return `${leansOn}; ${moves} moves, ${clockwise} of them clockwise, and ${rests} rests`
}

function around(centre: number, half: number): readonly [number, number] {
  return [centre - half, centre + half]
}

function halfOf(interval: readonly (number | null)[]): number {
  return ((interval[1] ?? NaN) - (interval[0] ?? NaN)) / 2
}
