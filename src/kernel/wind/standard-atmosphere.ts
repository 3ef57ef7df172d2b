import { InputError } from '../../errors.ts'

const SEA_LEVEL_HPA = 1013.25
const SEA_LEVEL_KELVIN = 288.15
/** Fall of temperature with geopotential altitude in the troposphere, K/m. */
const LAPSE = 0.0065
/** g / (R lapse) of the standard atmosphere, no unit. */
const EXPONENT = 9.80665 / (287.05287 * LAPSE)
/** Nominal radius of the earth that turns geometric into geopotential altitude, m. */
const EARTH_RADIUS_M = 6_356_766
const LOWEST_M = -1000
const HIGHEST_M = 11_000

/**
 * Air pressure that goes with an altitude, for logs without a barometer.
 *
 * @param altitudeM  geometric altitude of the place (hub, not tower foot) above sea level, m, -1000 to 11000. NaN
 *   gives NaN.
 * @param temperatureC  air temperature at that altitude, degrees C; left out or NaN: the standard atmosphere's own.
 *   With it the column below is taken as warmer or colder throughout (same lapse rate, 1013.25 hPa at sea level).
 * @returns hPa. The weather moves the true pressure about this by some 1 %, seldom 3 %.
 * @throws InputError OUT_OF_RANGE for an altitude outside the troposphere.
 * @source ISO 2533:1975, Standard Atmosphere (the same as the US Standard Atmosphere 1976 in this range).
 * @example pressureFromAltitude(1000) // 898.76
 */
export function pressureFromAltitude(altitudeM: number, temperatureC = NaN): number {
  if (Number.isNaN(altitudeM)) return NaN
  if (!(altitudeM >= LOWEST_M && altitudeM <= HIGHEST_M)) {
    throw new InputError('OUT_OF_RANGE', `altitudeM: expected ${LOWEST_M} to ${HIGHEST_M}, got ${altitudeM}`)
  }
  const geopotentialM = (EARTH_RADIUS_M * altitudeM) / (EARTH_RADIUS_M + altitudeM)
  const hereKelvin = Number.isNaN(temperatureC)
    ? SEA_LEVEL_KELVIN - LAPSE * geopotentialM
    : temperatureC + 273.15
  if (!(hereKelvin > 0)) return NaN
  return SEA_LEVEL_HPA * Math.pow(hereKelvin / (hereKelvin + LAPSE * geopotentialM), EXPONENT)
}
