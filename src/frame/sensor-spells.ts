import type { TurbineColumns, TurbineFrame } from './frame.ts'
import type { IcedAnemometer } from './iced-anemometer.ts'
import { stillSpells } from './still-spells.ts'
import { conventionalVane, type ConventionalVane } from './vane-convention.ts'

/** From this wind speed on a vane turns and a cup runs, m/s. Common practice, no source. */
const WIND_MOVES_MS = 3
/** A turbine that makes more than this share of its largest power has wind. */
const PRODUCES_SHARE = 0.03

export interface SensorSpells {
  readonly spells: TurbineFrame['spells']
  /** 1 = inside a frozen spell of the vane; length n. */
  readonly vaneFrozen: Uint8Array
  /** 1 = vane or anemometer gave no measurement over the whole row. */
  readonly unmeasured: Uint8Array
  /** 1 = ... or over a part of it. */
  readonly fault: Uint8Array
  /** The second vane in the frame's convention; NaN where there is none. */
  readonly vane2: Float64Array
}

/** Rows in which vane or anemometer stood still or carried ice. Nacelle position plays no part in it. */
export function sensorSpells(
  columns: TurbineColumns,
  vane: Float64Array,
  convention: ConventionalVane,
  sign: 1 | -1,
  iced: IcedAnemometer,
  intervalMs: number,
): SensorSpells {
  const { time, numbers } = columns
  const n = time.length
  const missing = new Float64Array(n).fill(NaN)
  const windSpeed = numbers['wind_speed'] ?? missing
  const power = numbers['power'] ?? missing
  const airTemperature = numbers['air_temperature']
  const most = power.reduce((max, value) => (value > max ? value : max), 0)
  const produces = Uint8Array.from(power, (value) => (value > PRODUCES_SHARE * most ? 1 : 0))
  const blows = Uint8Array.from(windSpeed, (value, i) =>
    value >= WIND_MOVES_MS || produces[i] === 1 ? 1 : 0,
  )
  const own = convention.source === 'vane'
  const still = (
    values: Float64Array,
    live: Uint8Array,
    sd: Float64Array | undefined,
    others: Float64Array[],
  ) => stillSpells({ time, intervalMs, values, sd, live, airTemperature, others })
  const ofVane = still(own ? vane : missing, blows, convention.vaneSd, [windSpeed, power])
  const ofWind = still(windSpeed, produces, numbers['wind_speed_sd'], [vane, power])
  const unmeasured = ofVane.inside.map((flag, i) => flag | ofWind.inside[i]! | iced.inside[i]!)
  const second = numbers['vane_2']
  return {
    spells: {
      vaneFrozen: ofVane.spells,
      anemometerStuck: ofWind.spells,
      anemometerIced: iced.spells,
    },
    vaneFrozen: ofVane.inside,
    unmeasured,
    fault: unmeasured.map((flag, i) => flag | ofVane.beside[i]! | ofWind.beside[i]!),
    vane2: second
      ? conventionalVane({ vane: second, power, sign, centre: own ? convention.centreDeg : undefined }).vane
      : missing,
  }
}
