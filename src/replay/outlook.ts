import { costAt, probabilityBeyond, shrunkOffsets, type ShrunkOffsets } from '../analysis/index.ts'
import type { Outlook, TurbineSheet } from '../sheet/index.ts'

const NORMAL_95 = 1.959963984540054

type Unseen = Omit<TurbineSheet, 'outlook'>

/** Half-width of m at 95 %, were the exponent known; NaN without an estimate. */
export function knownHalfDeg({ staticOffset }: Unseen): number {
  if (staticOffset.standingMisalignmentDeg === null) return NaN
  const { statistical, response, instrument, dilution } = staticOffset.intervalParts
  return Math.hypot(statistical ?? 0, response ?? 0, instrument ?? 0, dilution ?? 0)
}

/** The offsets of some turbines, seen together. A turbine that came to no number, or is blocked, is not measured. */
export function shrunkGroup(turbines: readonly Unseen[]): ShrunkOffsets {
  return shrunkOffsets(
    turbines.map((turbine) => ({
      standingDeg:
        turbine.verdict === 'blocked' ? NaN : (turbine.staticOffset.standingMisalignmentDeg ?? NaN),
      halfDeg: knownHalfDeg(turbine),
    })),
  )
}

/**
 * What is expected of every turbine of a farm once the luck of the largest is taken out.
 *
 * @returns one entry for each; null without an estimate.
 */
export function outlooks(turbines: readonly Unseen[], thresholdDeg: number): (Outlook | null)[] {
  const shrunk = shrunkGroup(turbines)
  return turbines.map((turbine, i) => {
    if (turbine.staticOffset.standingMisalignmentDeg === null || turbine.verdict === 'blocked') return null
    const mean = shrunk.meanDeg[i]!
    const sd = shrunk.sdDeg[i]!
    const interval = [mean - NORMAL_95 * sd, mean + NORMAL_95 * sd] as const
    return {
      shrunkStandingDeg: mean,
      shrunkInterval95Deg: [...interval],
      probabilityBeyondThreshold: probabilityBeyond(mean, sd, thresholdDeg),
      expectedAnnualMwh: annualAt(turbine, mean),
      interval95Mwh: annualInterval(turbine, interval),
    }
  })
}

/** Static loss of a year if the rotor stood off by so much, MWh; NaN where it is not known. */
export function annualAt({ energyLoss }: Unseen, standingDeg: number): number {
  const points = energyLoss.static.byMisalignment.map((point) => ({
    standingDeg: point.standingDeg,
    cost: point.annualMwh ?? NaN,
  }))
  return costAt(points, standingDeg, energyLoss.exponent)
}

/** The same for an interval; what the exponent adds to the ends of the turbine's own interval it adds here too. */
function annualInterval(turbine: Unseen, [low, high]: readonly [number, number]): [number, number] {
  const ends = [annualAt(turbine, low), annualAt(turbine, high)]
  const standing = turbine.staticOffset.standingMisalignmentDeg!
  const half = knownHalfDeg(turbine)
  const known = [annualAt(turbine, standing - half), annualAt(turbine, standing + half)]
  const [lower, upper] = turbine.energyLoss.static.annualInterval95Mwh
  const ratio = (reached: number | null | undefined, of: number): number =>
    reached !== null && reached !== undefined && reached > 0 && of > 0 ? reached / of : 1
  return [
    low <= 0 && high >= 0 ? 0 : Math.min(...ends) * Math.min(1, ratio(lower, Math.min(...known))),
    Math.max(...ends) * Math.max(1, ratio(upper, Math.max(...known))),
  ]
}
