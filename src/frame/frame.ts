import type { MeasuredCurve } from '../kernel/wind/index.ts'
import type { SetAsideReason, TurbineSetup } from '../sheet/index.ts'
import type { AcrossNorthChannel } from './across-north.ts'
import type { Calendar } from './calendar.ts'
import type { SensorSpell } from './still-spells.ts'

/** Clean rows of one turbine as they come from storage, sorted by time. */
export interface TurbineColumns {
  readonly turbine: string
  /** Start of the interval, epoch ms; rising; length n. */
  readonly time: Float64Array
  /** Canonical channel -> values; length n; NaN = missing. `coverage`: of rows made of high-rate ones, 0 to 1. */
  readonly numbers: Readonly<Record<string, Float64Array>>
  /** Canonical text channel -> values; length n; null = missing. */
  readonly texts: Readonly<Record<string, readonly (string | null)[]>>
}

/** One turbine of the frame: everything the questions read, in clean units. All arrays have length n; NaN = missing. */
export interface TurbineFrame {
  readonly turbine: string
  readonly setup: TurbineSetup
  readonly model: string
  readonly intervalS: number
  readonly ratedPowerKw: number
  readonly ratedPowerSource: 'site file' | 'request' | 'log' | 'unknown'
  readonly time: Float64Array
  /** Index into the calendar of the farm. */
  readonly day: Int32Array
  /** 1 from 19:00 to 07:00 of the site's clock. */
  readonly night: Uint8Array
  /** As read, m/s. */
  readonly windSpeed: Float64Array
  readonly windSpeed2: Float64Array
  /** Degrees C. */
  readonly airTemperature: Float64Array
  /** As read, rpm. */
  readonly rotorSpeed: Float64Array
  /** kg/m3; NaN where there is no air temperature. */
  readonly density: Float64Array
  /** Normalised to 1.225 kg/m3 where the density is known, else as read; m/s. */
  readonly normalisedSpeed: Float64Array
  /** SD of the wind speed inside the interval over its mean, no unit. */
  readonly turbulence: Float64Array
  /** Sign as DESIGN: positive = wind from clockwise of the axis; degrees, [-180, 180). NaN inside frozen spells. */
  readonly vane: Float64Array
  /** What `vane` was made of, and what the logged angle reads when the rotor faces the wind. */
  readonly vaneSource: 'vane' | 'wind direction less nacelle position' | 'none'
  readonly vaneCentreDeg: 0 | 180
  /** The vane as it was read, frozen spells included, in the same sign; what the tests of the sensor look at. */
  readonly vaneRead: Float64Array
  /** The second vane, turned as the first; degrees, [-180, 180). */
  readonly vane2: Float64Array
  /** SD of the vane inside the interval, degrees. */
  readonly vaneSd: Float64Array
  /** Lowest and highest vane inside the interval, turned as the vane is, degrees; may run beyond half a turn. */
  readonly vaneMin: Float64Array
  readonly vaneMax: Float64Array
  /** kW. */
  readonly power: Float64Array
  /** As read, degrees; wrapped, signed or wound. NaN where it was averaged across the end of its scale. */
  readonly nacellePosition: Float64Array
  /** Of a reference instrument, sign as the vane's, as read; degrees. */
  readonly referenceYawError: Float64Array
  /** Of a reference instrument, as read; degrees: relative to the nacelle, or from north. */
  readonly referenceDirection: Float64Array
  /** N + v, [0, 360); off the true direction by north offset and vane offset. */
  readonly indicatedDirection: Float64Array
  /** Readings that were averaged across the end of their scale, by channel: NaN in the frame, their rows set aside. */
  readonly averagedAcrossNorth: Readonly<Record<AcrossNorthChannel, number>>
  /** Spells in which a sensor gave no measurement: their rows are set aside as `sensor-fault`. */
  readonly spells: {
    readonly vaneFrozen: readonly SensorSpell[]
    readonly anemometerStuck: readonly SensorSpell[]
    /** `value`: the reading as a share of what it usually is against the neighbours. */
    readonly anemometerIced: readonly SensorSpell[]
  }
  readonly densitySource: string
  /** 0 = used for the static offset, else 1 + index into SET_ASIDE_REASONS. */
  readonly reason: Uint8Array
  /** 1 = wind speed, vane and power are there and measured, the interval is complete, not excluded, and the turbine produces. */
  readonly running: Uint8Array
  /** 1 = held below what the wind offers, by set-point, pitch or category. */
  readonly limited: Uint8Array
  /** Power against normalised speed of rows that run unlimited and steadily. */
  readonly curve: MeasuredCurve
  /** Upper end of the wind speeds used for the static offset, m/s; NaN when the curve has no knee in the log. */
  readonly windMaxMs: number
  readonly windMinMs: number
  readonly notes: readonly string[]
}

/** The one table that every question reads. */
export interface Frame {
  readonly intervalS: number
  readonly fromMs: number
  /** End of the last interval. */
  readonly toMs: number
  readonly calendar: Calendar
  readonly turbines: readonly TurbineFrame[]
}

export type ReasonCounts = Readonly<Record<SetAsideReason | 'used', number>>
