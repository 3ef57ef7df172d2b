import { REFERENCE_DENSITY } from './air-density.ts'

/**
 * Wind speed that carries the same power at the reference density: the normalisation for turbines that limit their
 * power by pitch.
 *
 * @param speedMs  m/s.
 * @param densityKgM3  kg/m3, > 0.
 * @returns m/s; NaN where the speed is missing or the density missing or not above 0.
 * @source IEC 61400-12-1, active power control: Vn = V (rho / rho0)^(1/3).
 */
export function normalisedSpeed(speedMs: number, densityKgM3: number): number {
  return densityKgM3 > 0 ? speedMs * Math.cbrt(densityKgM3 / REFERENCE_DENSITY) : NaN
}

/**
 * Power at the reference density of a turbine that limits its power by stall at fixed pitch and speed.
 *
 * @param powerKw  kW (any unit; the result has the same).
 * @param densityKgM3  kg/m3, > 0.
 * @returns kW; NaN where the power is missing or the density missing or not above 0.
 * @source IEC 61400-12-1, stall control: Pn = P rho0 / rho.
 */
export function normalisedStallPower(powerKw: number, densityKgM3: number): number {
  return densityKgM3 > 0 ? (powerKw * REFERENCE_DENSITY) / densityKgM3 : NaN
}
