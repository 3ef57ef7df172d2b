import { powerAt } from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'

const BIN_DEG = 2

/** Power over the measured curve by vane, rows used for the offset: what a reader can draw the estimate from. */
export function powerByVane(frame: TurbineFrame): TurbineSheet['staticOffset']['bins'] {
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
      const squares = ratios.reduce((sum, ratio) => sum + (ratio - mean) ** 2, 0)
      return {
        vaneFromDeg: bin * BIN_DEG - BIN_DEG / 2,
        vaneToDeg: bin * BIN_DEG + BIN_DEG / 2,
        rows: ratios.length,
        relativePowerMean: mean,
        relativePowerSd: ratios.length > 1 ? Math.sqrt(squares / (ratios.length - 1)) : NaN,
      }
    })
}
