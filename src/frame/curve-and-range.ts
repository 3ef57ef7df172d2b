import { kneeSpeed, measuredPowerCurve, powerAt, type MeasuredCurve } from '../kernel/wind/index.ts'
import { REASON_CODE, setAsideByRange } from './set-aside.ts'

/** Share of rated power up to which rows are used: the knee itself answers less and less to the wind. */
const KNEE_SHARE = 0.8
/** Upper end of the wind speeds used where the log shows no rated power, m/s. */
const WIND_MAX_WITHOUT_KNEE_MS = 10

/** The part of a frame that follows from its wind speeds. */
export interface CurveAndRange {
  readonly reason: Uint8Array
  readonly curve: MeasuredCurve
  readonly windMaxMs: number
}

/**
 * Measures the power curve on the rows that earlier tests left, and sets aside what lies outside the range of wind speeds
 * and vanes. Reasons of an earlier round of these two tests are forgotten.
 *
 * @param reason  codes of REASON_CODE, length n; not changed.
 */
export function curveAndRange(
  reason: Uint8Array,
  normalisedSpeed: Float64Array,
  vane: Float64Array,
  power: Float64Array,
  limits: { ratedPowerKw: number; windMinMs: number; vaneMaxDeg: number },
): CurveAndRange {
  const byRange = [REASON_CODE['outside-wind-range'], REASON_CODE['vane-out-of-range']]
  const open = reason.map((code) => (byRange.includes(code) ? 0 : code))
  const curve = measuredPowerCurve(
    normalisedSpeed.filter((_, i) => open[i] === 0),
    power.filter((_, i) => open[i] === 0),
  )
  const knee = kneeSpeed(curve, limits.ratedPowerKw, KNEE_SHARE)
  const windMaxMs = Number.isNaN(knee) ? WIND_MAX_WITHOUT_KNEE_MS : knee
  setAsideByRange(open, normalisedSpeed, vane, {
    minMs: limits.windMinMs,
    maxMs: windMaxMs,
    vaneMaxDeg: limits.vaneMaxDeg,
    isCovered: (speed) => !Number.isNaN(powerAt(curve, speed)),
  })
  return { reason: open, curve, windMaxMs }
}
