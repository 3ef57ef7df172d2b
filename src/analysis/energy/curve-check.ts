import { annualEnergy, kneeSpeed, rayleighCumulative } from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import { BINNED_NOT_A_TEST, type EnergyLoss } from '../../sheet/index.ts'

/** What a standard test asks of its data, hours in all and minutes in a bin. @source IEC 61400-12-1, database. */
const HOURS_NEEDED = 180
const MINUTES_NEEDED = 30
/** Bins are asked for from the first one with power up to this many times the speed at 85 % of rated power. */
const RATED_SHARE = 0.85
const BEYOND_RATED = 1.5

/** Whether the measured curve has the rows that a standard test would ask for; it is none, whatever the answer. */
export function curveCheck(frame: TurbineFrame): EnergyLoss['curveCheck'] {
  const { curve, intervalS } = frame
  const { bins, binWidthMs, counts } = curve
  const minutesOf = new Map(Array.from(bins, (bin, k) => [bin, (counts[k]! * intervalS) / 60]))
  const hours = ((curve.rows + curve.rowsInThinBins) * intervalS) / 3600
  const knee = kneeSpeed(curve, frame.ratedPowerKw, RATED_SHARE)
  const first = bins.find((_, k) => curve.fittedKw[k]! > 0) ?? 0
  const last = Number.isNaN(knee) ? (bins.at(-1) ?? -1) : Math.floor((BEYOND_RATED * knee) / binWidthMs)
  const incompleteBins: EnergyLoss['curveCheck']['incompleteBins'] = []
  for (let bin = first; bin <= last; bin++) {
    const minutes = minutesOf.get(bin) ?? 0
    if (!(minutes >= MINUTES_NEEDED)) incompleteBins.push({ windSpeedMs: bin * binWidthMs, minutes })
  }
  const reachesRated = !Number.isNaN(knee)
  return {
    label: BINNED_NOT_A_TEST,
    hours,
    hoursNeeded: HOURS_NEEDED,
    minutesNeeded: MINUTES_NEEDED,
    bins: Math.max(0, last - first + 1),
    incompleteBins,
    complete: reachesRated && hours >= HOURS_NEEDED && incompleteBins.length === 0,
    note: reachesRated
      ? `bins asked for: up to ${BEYOND_RATED} times the wind speed at ${100 * RATED_SHARE} % of rated power`
      : `the curve does not reach ${100 * RATED_SHARE} % of rated power: bins are asked for as far as it goes`,
  }
}

/**
 * The curve of the site file beside the measured one. It is used for nothing else.
 *
 * @param year  mean of the Rayleigh distribution under which the energies are compared; on the scale of the curve and as printed.
 * @returns null where none is supplied.
 */
export function suppliedCurve(
  frame: TurbineFrame,
  year: { curveMeanMs: number; printedMeanMs: number },
): EnergyLoss['suppliedCurve'] {
  const supplied = [...(frame.setup.powerCurve ?? [])].sort((a, b) => a.windSpeedMs - b.windSpeedMs)
  if (supplied.length === 0) return null
  const { speedsMs, fittedKw } = frame.curve
  const suppliedKw = Float64Array.from(speedsMs, (speed) => between(supplied, speed))
  const bins = Array.from(speedsMs, (windSpeedMs, k) => ({
    windSpeedMs,
    measuredKw: fittedKw[k]!,
    suppliedKw: suppliedKw[k]!,
    differencePct: suppliedKw[k]! > 0 ? 100 * (fittedKw[k]! / suppliedKw[k]! - 1) : NaN,
  }))
  const both = bins.filter((bin) => !Number.isNaN(bin.suppliedKw))
  const energy = (valueOf: (bin: (typeof bins)[number]) => number): number =>
    year.curveMeanMs > 0
      ? annualEnergy(
          both.map((bin) => bin.windSpeedMs),
          both.map(valueOf),
          (speed) => rayleighCumulative(speed, year.curveMeanMs),
        ).measuredMwh
      : NaN
  const expected = energy((bin) => bin.suppliedKw)
  const aepDifferencePct = expected > 0 ? 100 * (energy((bin) => bin.measuredKw) / expected - 1) : NaN
  return {
    bins,
    aepDifferencePct,
    meanWindSpeedMs: year.printedMeanMs,
    note: `over the bins that both have; ${BINNED_NOT_A_TEST}: the nacelle anemometer stands behind the rotor and has an error of its own`,
  }
}

/** Straight between the points that were supplied, NaN outside them. */
function between(points: readonly { windSpeedMs: number; powerKw: number }[], speedMs: number): number {
  const next = points.findIndex((point) => point.windSpeedMs >= speedMs)
  if (next < 0) return NaN
  const right = points[next]!
  if (right.windSpeedMs === speedMs) return right.powerKw
  const left = points[next - 1]
  if (left === undefined) return NaN
  const share = (speedMs - left.windSpeedMs) / (right.windSpeedMs - left.windSpeedMs)
  return left.powerKw + share * (right.powerKw - left.powerKw)
}
