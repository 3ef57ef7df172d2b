/**
 * Canonical log columns, their unit, and the limits outside of which a value is no measurement.
 * Limits are wide on purpose: they catch sentinels and broken sensors, not rare weather.
 */
export const NUMBER_CHANNELS = {
  wind_speed: { unit: 'm/s', min: 0, max: 75 },
  wind_speed_2: { unit: 'm/s', min: 0, max: 75 },
  vane: { unit: 'deg', min: -360, max: 720 },
  vane_2: { unit: 'deg', min: -360, max: 720 },
  wind_direction: { unit: 'deg', min: -360, max: 720 },
  nacelle_position: { unit: 'deg', min: -7200, max: 7200 },
  power: { unit: 'kW', min: -5000, max: 50000 },
  power_limit: { unit: 'kW', min: 0, max: 50000 },
  pitch: { unit: 'deg', min: -180, max: 180 },
  rotor_speed: { unit: 'rpm', min: -50, max: 500 },
  air_temperature: { unit: 'degC', min: -60, max: 65 },
  air_pressure: { unit: 'hPa', min: 500, max: 1100 },
  humidity: { unit: '%', min: 0, max: 100 },
  yaw_active: { unit: '1', min: 0, max: 1 },
  reference_direction: { unit: 'deg', min: -360, max: 720 },
  reference_yaw_error: { unit: 'deg', min: -180, max: 180 },
  reference_wind_speed: { unit: 'm/s', min: 0, max: 75 },
} as const satisfies Record<string, { unit: string; min: number; max: number }>

export const TEXT_CHANNELS = ['status', 'availability_category'] as const

/** Statistics of an interval, by suffix; the bare name is the mean. */
export const STATISTICS = ['sd', 'min', 'max'] as const

export type BaseChannel = keyof typeof NUMBER_CHANNELS
export type NumberChannel = BaseChannel | `${BaseChannel}_${(typeof STATISTICS)[number]}`
export type TextChannel = (typeof TEXT_CHANNELS)[number]
