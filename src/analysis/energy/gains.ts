import { RAD_PER_DEG, wrap180 } from '../../kernel/angle/index.ts'
import { powerAt } from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import { SET_ASIDE_REASONS, type SetAsideReason } from '../../sheet/index.ts'

/** The cosine law says nothing about a rotor further off the wind, degrees. */
const MAX_YAW_ERROR_DEG = 60
/** Reasons that leave unknown what the turbine did, unless it is seen to make no power. */
const UNKNOWN: readonly SetAsideReason[] = ['missing-channel', 'averaged-across-north', 'incomplete-interval']

/** Rows that a better heading could have made more of. All arrays have one entry for each of them. */
export interface GainRows {
  /** Index into the frame. */
  readonly rows: Int32Array
  /** The measured curve at the row's wind speed, kW; never NaN. */
  readonly basePower: Float64Array
}

/** 1 = it is known what the turbine did in the row: ran, stood, or was held back. The others are gaps. */
export function knownRows(frame: TurbineFrame): Uint8Array {
  return Uint8Array.from(frame.time, (_, i) => {
    if (frame.running[i] === 1) return 1
    const reason = SET_ASIDE_REASONS[frame.reason[i]! - 1]
    if (reason === 'excluded') return 0
    return reason !== undefined && UNKNOWN.includes(reason) && !(frame.power[i]! <= 0) ? 0 : 1
  })
}

/** All producing rows that are not held back and for which the curve has an answer: elsewhere yaw changes nothing that is seen. */
export function gainRows(frame: TurbineFrame): GainRows {
  const rows: number[] = []
  const basePower: number[] = []
  for (let i = 0; i < frame.time.length; i++) {
    if (frame.running[i] !== 1 || frame.limited[i] !== 0) continue
    const power = powerAt(frame.curve, frame.normalisedSpeed[i]!)
    if (Number.isNaN(power)) continue
    rows.push(i)
    basePower.push(power)
  }
  return { rows: Int32Array.from(rows), basePower: Float64Array.from(basePower) }
}

/**
 * Power that rows gain when their yaw error changes from one angle to another, by the measured curve, which already contains
 * the first: P(u [cos(then) / cos(now)]^(p/3)) - P(u), each at most rated.
 *
 * @param errorsDeg  yaw error of a row before and after, from its vane; degrees.
 * @returns kW; one entry for each of `rows`.
 */
export function gainsKw(
  frame: TurbineFrame,
  { rows, basePower }: GainRows,
  exponent: number,
  errorsDeg: (vaneDeg: number) => readonly [now: number, then: number],
): Float64Array {
  const rated = Number.isNaN(frame.ratedPowerKw) ? Infinity : frame.ratedPowerKw
  const gains = new Float64Array(rows.length)
  for (let k = 0; k < rows.length; k++) {
    const i = rows[k]!
    const power = basePower[k]!
    const [now, then] = errorsDeg(frame.vane[i]!)
    const ratio = cosine(then) / cosine(now)
    const faced = powerAt(frame.curve, frame.normalisedSpeed[i]! * ratio ** (exponent / 3))
    // Beyond the last bin the curve has no answer: the turbine is at what it showed at most.
    gains[k] = Math.min(rated, Number.isNaN(faced) ? power : faced) - Math.min(rated, power)
  }
  return gains
}

function cosine(angleDeg: number): number {
  return Math.cos(Math.min(MAX_YAW_ERROR_DEG, Math.abs(wrap180(angleDeg))) * RAD_PER_DEG)
}
