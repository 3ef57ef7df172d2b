import { rowsBetween, type TurbineFrame } from '../../frame/index.ts'
import { preferReference } from '../offset/prefer-reference.ts'
import { referenceOffset } from '../offset/reference-offset.ts'
import { staticOffset, type StaticOffsetRequest } from '../offset/static-offset.ts'
import type { Sides } from './judged-step.ts'

/** m on one side of a correction; degrees. NaN: not to be had. */
export interface StandingSide {
  readonly deg: number
  /** At 95 %; the ends need not lie alike to either side. */
  readonly interval95Deg: readonly [number, number]
  /** Half-width that the two sides do not share: scatter alone. */
  readonly ownHalfWidthDeg: number
  /** Half-width that they do share, at the exponent in force: response, instrument, dilution. */
  readonly sharedHalfWidthDeg: number
}

export interface StandingEachSide {
  readonly before: StandingSide
  readonly after: StandingSide
}

/** Estimates the standing misalignment anew from the rows on each side, as the sheet does it. */
export function standingEachSide(
  frame: TurbineFrame,
  sides: Sides,
  request: StaticOffsetRequest,
): StandingEachSide {
  const on = (fromMs: number, toMs: number): StandingSide => {
    const byPower = staticOffset(rowsBetween(frame, fromMs, toMs), request)
    const answer = preferReference(
      byPower,
      referenceOffset(byPower.frame, request.dayWeights),
      request.settings,
    )
    const { standing } = answer
    if (!standing)
      return { deg: NaN, interval95Deg: [NaN, NaN], ownHalfWidthDeg: NaN, sharedHalfWidthDeg: NaN }
    const { statistical, response, instrument, dilution } = answer.sheet.intervalParts
    return {
      deg: standing.standingDeg,
      interval95Deg: standing.standingInterval95Deg,
      ownHalfWidthDeg: statistical ?? NaN,
      sharedHalfWidthDeg: Math.hypot(response ?? 0, instrument ?? 0, dilution ?? 0),
    }
  }
  return {
    before: on(sides.beforeFromMs, sides.beforeToMs),
    after: on(sides.afterFromMs, sides.afterToMs),
  }
}
