import { steepnessAt } from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'

/** The measured curve as the estimate used it: binned in the manner of IEC 61400-12-1, not a power performance test. */
export function powerCurveTable(frame: TurbineFrame): TurbineSheet['powerCurve'] {
  return Array.from(frame.curve.speedsMs, (windSpeedMs, k) => ({
    windSpeedMs,
    powerKw: frame.curve.fittedKw[k]!,
    rows: frame.curve.counts[k]!,
    steepness: steepnessAt(frame.curve, windSpeedMs),
  }))
}
