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
  // Raw words, decoded as the site file describes the sensors.
  vane_code: { unit: '1', min: 0, max: 2 ** 52 },
  vane_ratio: { unit: '1', min: -1, max: 2 },
  nacelle_code: { unit: '1', min: 0, max: 2 ** 52 },
  pulse_a: { unit: '1', min: 0, max: 1 },
  pulse_b: { unit: '1', min: 0, max: 1 },
  pulse_z: { unit: '1', min: 0, max: 1 },
  transit_1: { unit: 'us', min: 0, max: 1e6 },
  transit_2: { unit: 'us', min: 0, max: 1e6 },
  transit_3: { unit: 'us', min: 0, max: 1e6 },
  transit_4: { unit: 'us', min: 0, max: 1e6 },
  transit_5: { unit: 'us', min: 0, max: 1e6 },
  transit_6: { unit: 'us', min: 0, max: 1e6 },
} as const satisfies Record<string, { unit: string; min: number; max: number }>

/**
 * Words as a sensor gives them: they have no mean. `transit_1`, `transit_2`: time of flight of the first path of an ultrasonic
 * sensor, forward and backward; `_3`, `_4` the second; `_5`, `_6` the third.
 */
export const RAW_CHANNELS = [
  'vane_code',
  'vane_ratio',
  'nacelle_code',
  'pulse_a',
  'pulse_b',
  'pulse_z',
  'transit_1',
  'transit_2',
  'transit_3',
  'transit_4',
  'transit_5',
  'transit_6',
] as const satisfies readonly (keyof typeof NUMBER_CHANNELS)[]
export type RawChannel = (typeof RAW_CHANNELS)[number]

export const TEXT_CHANNELS = ['status', 'availability_category'] as const

/** Statistics of an interval, by suffix; the bare name is the mean. */
export const STATISTICS = ['sd', 'min', 'max'] as const

export type BaseChannel = keyof typeof NUMBER_CHANNELS
export type NumberChannel = BaseChannel | `${BaseChannel}_${(typeof STATISTICS)[number]}`
export type TextChannel = (typeof TEXT_CHANNELS)[number]
