import { rowsBetween, type TurbineFrame } from '../../frame/index.ts'
import { preferReference } from '../offset/prefer-reference.ts'
import { referenceOffset } from '../offset/reference-offset.ts'
import { staticOffset, type StaticOffsetRequest } from '../offset/static-offset.ts'
import type { Sides } from './judged-step.ts'

/** m on one side of a correction; degrees. NaN: not to be had. */
export interface StandingSide {
  readonly deg: number
  readonly halfWidthDeg: number
  /** The part of the half-width that the two sides do not share. */
  readonly ownHalfWidthDeg: number
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
    if (!standing) return { deg: NaN, halfWidthDeg: NaN, ownHalfWidthDeg: NaN }
    const [low, high] = standing.standingInterval95Deg
    return {
      deg: standing.standingDeg,
      halfWidthDeg: (high - low) / 2,
      ownHalfWidthDeg: answer.sheet.intervalParts.statistical ?? NaN,
    }
  }
  return {
    before: on(sides.beforeFromMs, sides.beforeToMs),
    after: on(sides.afterFromMs, sides.afterToMs),
  }
}
