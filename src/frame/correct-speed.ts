import type { TurbineFrame } from './frame.ts'
import { curveAndRange } from './curve-and-range.ts'

/**
 * A frame whose wind speeds are what the anemometer would read if it did not answer to yaw: u / (1 + a v), v in degrees.
 * Curve and range of wind speeds are made anew from them: picked by the reading itself, rows would be picked by the vane.
 *
 * @param responsePerDeg  a, relative change per degree of vane.
 * @param vaneMaxDeg      as when the frame was built.
 * @returns the same frame for a response of 0.
 */
export function correctSpeed(frame: TurbineFrame, responsePerDeg: number, vaneMaxDeg: number): TurbineFrame {
  if (responsePerDeg === 0) return frame
  const normalisedSpeed = frame.normalisedSpeed.map((speed, i) => {
    const factor = 1 + responsePerDeg * frame.vane[i]!
    return factor > 0.5 ? speed / factor : NaN // so far off the wind a linear response means nothing
  })
  return {
    ...frame,
    normalisedSpeed,
    ...curveAndRange(frame.reason, normalisedSpeed, frame.vane, frame.power, {
      ratedPowerKw: frame.ratedPowerKw,
      windMinMs: frame.windMinMs,
      vaneMaxDeg,
    }),
  }
}
