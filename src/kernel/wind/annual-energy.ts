import { InputError } from '../../errors.ts'

const HOURS_PER_YEAR = 8760
/** IEC 61400-12-1 calls an energy incomplete when the measured part is below this share of the extrapolated. */
const COMPLETE_SHARE = 0.95

export interface AnnualEnergyOptions {
  /** Speed up to which the last bin's power is held for the extrapolated energy, m/s. Default: the last bin. */
  cutOutMs?: number
  /** How far below the first bin the power is taken to be 0, m/s, > 0. Default 0.5. */
  binWidthMs?: number
}

export interface AnnualEnergy {
  /** MWh a year with no power outside the bins. */
  measuredMwh: number
  /** MWh a year with the last bin's power held up to cut-out. */
  extrapolatedMwh: number
  /** measured / extrapolated, no unit. */
  measuredShare: number
  /** False when the measured share is below 0.95 or not known. */
  complete: boolean
  /** Bins that went in. */
  bins: number
}

/**
 * Energy of a year under a wind distribution: a binned sum in the manner of IEC 61400-12-1. It is not a power
 * performance test: the speeds come from where the caller took them, with no calibrated mast and no uncertainty budget.
 *
 * AEP = 8760 h x sum of (F(Vi) - F(Vi-1)) (Pi-1 + Pi) / 2 with V0 = V1 - bin width and P0 = 0, for 100 % availability.
 *
 * @param speedsMs  speed of each bin, m/s, rising; length n.
 * @param powersKw  power of each bin, kW; length n. A bin whose speed or power is NaN is left out, and its neighbours
 *   are joined by the trapezoid between them.
 * @param cumulative  share of the time at or below a speed, such as a Rayleigh distribution's.
 * @returns all numbers NaN and `complete` false when no bin is left. A share of energies whose sum is not above 0 is NaN.
 * @throws InputError LENGTH_MISMATCH; OUT_OF_RANGE for speeds that do not rise or a bin width not above 0.
 * @source IEC 61400-12-1, annual energy production, measured and extrapolated.
 */
export function annualEnergy(
  speedsMs: ArrayLike<number>,
  powersKw: ArrayLike<number>,
  cumulative: (speedMs: number) => number,
  { cutOutMs = NaN, binWidthMs = 0.5 }: AnnualEnergyOptions = {},
): AnnualEnergy {
  if (powersKw.length !== speedsMs.length) {
    throw new InputError(
      'LENGTH_MISMATCH',
      `powersKw: expected ${speedsMs.length} values, got ${powersKw.length}`,
    )
  }
  if (!(binWidthMs > 0)) {
    throw new InputError('OUT_OF_RANGE', `binWidthMs: expected > 0, got ${binWidthMs}`)
  }
  let lastSpeed = NaN
  let lastPower = 0
  let lastShare = 0
  let meanKw = 0
  let bins = 0
  for (let i = 0; i < speedsMs.length; i++) {
    const speed = speedsMs[i]!
    const power = powersKw[i]!
    if (Number.isNaN(speed) || Number.isNaN(power)) continue
    if (bins > 0 && !(speed > lastSpeed)) {
      throw new InputError('OUT_OF_RANGE', `speedsMs[${i}]: expected above ${lastSpeed}, got ${speed}`)
    }
    if (bins === 0) lastShare = cumulative(speed - binWidthMs)
    const share = cumulative(speed)
    meanKw += ((share - lastShare) * (lastPower + power)) / 2
    lastSpeed = speed
    lastPower = power
    lastShare = share
    bins++
  }
  if (bins === 0) {
    return { measuredMwh: NaN, extrapolatedMwh: NaN, measuredShare: NaN, complete: false, bins }
  }
  // Between bins of equal power the sum telescopes, so one step reaches cut-out whatever the bin width.
  const beyondKw = cutOutMs > lastSpeed ? (cumulative(cutOutMs) - lastShare) * lastPower : 0
  const measuredMwh = (HOURS_PER_YEAR * meanKw) / 1000
  const extrapolatedMwh = (HOURS_PER_YEAR * (meanKw + beyondKw)) / 1000
  const measuredShare = extrapolatedMwh > 0 ? measuredMwh / extrapolatedMwh : NaN
  return { measuredMwh, extrapolatedMwh, measuredShare, complete: measuredShare >= COMPLETE_SHARE, bins }
}
