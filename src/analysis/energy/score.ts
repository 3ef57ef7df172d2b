import { cosineLaw, powerAt } from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import { runningBelowRated } from '../vane-statistics.ts'

export interface Score {
  /** 100 x E[cos(g)^3], 0 to 100; NaN without rows. */
  readonly score: number
  /** Upper bound of what the spread inside the intervals costs, % of energy; NaN without the SD of the vane. */
  readonly withinInterval: number
}

/**
 * How well the rotor faced the wind: 100 x E[cos(g)^3] over running rows below rated, weighted by the energy on offer
 * (the measured curve at the row's wind speed), from interval means.
 *
 * Inside an interval the vane's SD holds wind that no rotor could follow and the vane's own noise besides the yaw error,
 * so 3/2 of its mean square is an upper bound of the further loss.
 */
export function score(frame: TurbineFrame, offsetDeg: number): Score {
  let weight = 0
  let faced = 0
  let spreadWeight = 0
  let squares = 0
  for (const i of runningBelowRated(frame)) {
    const available = powerAt(frame.curve, frame.normalisedSpeed[i]!)
    if (!(available > 0)) continue
    weight += available
    faced += available * cosineLaw(frame.vane[i]! + offsetDeg, 3)
    const sd = frame.vaneSd[i]! * (Math.PI / 180)
    if (!Number.isNaN(sd)) {
      spreadWeight += available
      squares += available * sd * sd
    }
  }
  return {
    score: weight > 0 ? (100 * faced) / weight : NaN,
    withinInterval: spreadWeight > 0 ? (100 * 1.5 * squares) / spreadWeight : NaN,
  }
}
