/** Density to which speeds and powers are normalised, kg/m3: dry air of 15 degrees C at 1013.25 hPa (ISO 2533). */
export const REFERENCE_DENSITY = 1.225

/** Gas constant of dry air, J/(kg K), as rounded by IEC 61400-12-1. */
const R_DRY = 287.05
/** Gas constant of water vapour, J/(kg K), as rounded by IEC 61400-12-1. */
const R_VAPOUR = 461.5
const KELVIN_AT_ZERO_C = 273.15

export interface AirState {
  pressureHpa: number
  temperatureC: number
  /** Relative humidity, percent. Left out or NaN: the air counts as dry. */
  humidityPct?: number
}

/**
 * Air density from what a met sensor logs.
 *
 * @param air  pressure of the place (not reduced to sea level), hPa, > 0; temperature, degrees C, above absolute
 *   zero; humidity, percent, what lies outside 0 to 100 counts as 0 or 100.
 * @returns kg/m3. NaN when pressure or temperature is missing or impossible. Missing humidity counts as dry air,
 *   which at 20 degrees C and 50 % is 0.4 % too dense.
 * @source IEC 61400-12-1 in the form rho = (B/R0 - phi Pw (1/R0 - 1/Rw)) / T with Pw = 2.05e-5 exp(0.0631846 T) Pa,
 *   which stays within 4 % of the vapour pressure tables between 0 and 30 degrees C (0.0005 kg/m3 of density).
 * @example airDensity({ pressureHpa: 1013.25, temperatureC: 15 }) // 1.22501
 */
export function airDensity({ pressureHpa, temperatureC, humidityPct = 0 }: AirState): number {
  const kelvin = temperatureC + KELVIN_AT_ZERO_C
  if (!(pressureHpa > 0 && kelvin > 0)) return NaN
  const share = Number.isNaN(humidityPct) ? 0 : Math.min(Math.max(humidityPct, 0), 100) / 100
  const vapourPa = share * 2.05e-5 * Math.exp(0.0631846 * kelvin)
  return ((pressureHpa * 100) / R_DRY - vapourPa * (1 / R_DRY - 1 / R_VAPOUR)) / kelvin
}
