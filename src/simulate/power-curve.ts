/** Power of a rotor that faces the wind, tabulated: fast to read inside the 1 s loop. */
export interface PowerTable {
  /** kW at i / `perMs` m/s of density-normalised rotor-effective wind speed; the last entry holds for anything above. */
  readonly powerKw: Float64Array
  /** Entries for each m/s. */
  readonly perMs: number
}

const PER_MS = 50
const MAX_MS = 60
/** Cube of the speed at which the blades just pay for the losses, m3/s3: sets the steepness near cut-in. */
const LOSS_CUBE = 45.5
/** Roundness of the foot of the curve, m3/s3. */
const FOOT = 12
/** Sharpness of the knee: 2 is very round, 20 nearly a corner. */
const KNEE = 6

/**
 * Power curve P(u) of one second for a rotor-effective wind speed at 1.225 kg/m3: a cube less a constant loss, with a
 * round foot and a round knee. Its steepness d ln P / d ln u is 5.8 at 4.5 m/s, 4.1 at 5.5 and 2.6 at 11 for a rated wind
 * speed of 12: the figures seen on measured curves of real turbines. The form itself is a fit to them, no source.
 *
 * @param ratedPowerKw kW, > 0
 * @param ratedWindMs m/s, > 4: where the cube alone would reach rated power
 */
export function powerTable(ratedPowerKw: number, ratedWindMs: number): PowerTable {
  const powerKw = new Float64Array(MAX_MS * PER_MS + 2)
  const full = ratedWindMs ** 3 - LOSS_CUBE
  for (let i = 0; i < powerKw.length; i++) {
    const excess = (i / PER_MS) ** 3 - LOSS_CUBE
    const share = (excess > 40 * FOOT ? excess : FOOT * Math.log1p(Math.exp(excess / FOOT))) / full
    powerKw[i] = (ratedPowerKw * share) / (1 + share ** KNEE) ** (1 / KNEE)
  }
  return { powerKw, perMs: PER_MS }
}

/** Power in kW at a wind speed in m/s, linear between entries; speeds below 0 count as 0. */
export function powerAt(table: PowerTable, speedMs: number): number {
  const at = Math.min(Math.max(speedMs, 0) * table.perMs, table.powerKw.length - 2)
  const i = Math.floor(at)
  return table.powerKw[i]! + (at - i) * (table.powerKw[i + 1]! - table.powerKw[i]!)
}

/** The lowest wind speed of the table at which power reaches `powerKw`, m/s; the end of the table when it never does. */
export function speedAtPower(table: PowerTable, powerKw: number): number {
  const i = table.powerKw.findIndex((value) => value >= powerKw)
  return (i < 0 ? table.powerKw.length - 1 : i) / table.perMs
}

/** Entries for each degree of the table of `cosPower`. */
export const COS_POWER_PER_DEG = 10

/**
 * cos(g)^(p/3) for g = 0, 0.1 ... 180 degrees and one entry more; 0 from 90 degrees on.
 *
 * @param exponent p, no unit: 3 is the cos-cubed rule
 */
export function cosPowerTable(exponent: number): Float64Array {
  const table = new Float64Array(180 * COS_POWER_PER_DEG + 2)
  for (let i = 0; i < 90 * COS_POWER_PER_DEG; i++) {
    table[i] = Math.cos((i / COS_POWER_PER_DEG) * (Math.PI / 180)) ** (exponent / 3)
  }
  return table
}
