import { circularMean, circularMedian, circularSd, wrap180 } from '../kernel/angle/index.ts'
import type { TurbineFrame } from '../frame/index.ts'
import type { TurbineSheet } from '../sheet/index.ts'

/** Share of rated power above which a row no longer counts as below rated. */
const BELOW_RATED_SHARE = 0.97

/** Indices of the rows in which the turbine runs below rated power, whatever set them aside for the offset. */
export function runningBelowRated(frame: TurbineFrame): number[] {
  const rated = Number.isNaN(frame.ratedPowerKw) ? Infinity : frame.ratedPowerKw
  const indices: number[] = []
  for (let i = 0; i < frame.time.length; i++) {
    if (frame.running[i] === 1 && frame.power[i]! < BELOW_RATED_SHARE * rated) indices.push(i)
  }
  return indices
}

/** The vane as read, over all running rows below rated; never cut. */
export function vaneStatistics(frame: TurbineFrame): TurbineSheet['vane'] {
  const vane = runningBelowRated(frame).map((i) => frame.vane[i]!)
  const mean = circularMean(vane)
  return {
    meanDeg: wrap180(mean.direction),
    medianDeg: wrap180(circularMedian(vane)),
    circularSdDeg: circularSd(vane),
    resultantLength: mean.resultant,
    rows: vane.length,
  }
}
