import type { TurbineFrame } from '../../frame/index.ts'
import { wrap180 } from '../../kernel/angle/index.ts'

/** Time on either side of a day that comes with it, so that moves and their minutes are whole at midnight, ms. */
export const DAY_MARGIN_MS = 20 * 60_000
export const DAY_MS = 86_400_000

/** Log channels that the rows of a day are made of. */
export const HIGH_RATE_CHANNELS = [
  'wind_speed',
  'vane',
  'vane_2',
  'wind_direction',
  'nacelle_position',
  'power',
  'pitch',
  'rotor_speed',
  'yaw_active',
  'air_temperature',
] as const

/**
 * The rows of one turbine and one day (UTC) as they were logged, with {@link DAY_MARGIN_MS} on either side. Rising in time.
 * All arrays have length n; NaN = missing, a channel that is not in the log NaN throughout. Units and signs are the frame's.
 */
export interface HighRateRows {
  readonly turbine: string
  /** Start of the day, epoch ms. */
  readonly dayMs: number
  /** Rows of the day itself: indices [first, end). What is counted per day is counted over these. */
  readonly first: number
  readonly end: number
  /** Usual time between rows, s; NaN with fewer than two. */
  readonly sampleS: number
  /** Epoch ms. */
  readonly timeMs: Float64Array
  /** As read, m/s. */
  readonly windSpeed: Float64Array
  /** Degrees, [-180, 180), 0 ahead, positive = wind from clockwise of the axis. */
  readonly vane: Float64Array
  readonly vane2: Float64Array
  /** As read, degrees; wrapped, signed or wound. */
  readonly nacellePosition: Float64Array
  /** kW. */
  readonly power: Float64Array
  /** Degrees. */
  readonly pitch: Float64Array
  /** rpm. */
  readonly rotorSpeed: Float64Array
  /** 0 to 1: share of the row in which the yaw drive ran. */
  readonly yawActive: Float64Array
  /** Degrees C. */
  readonly airTemperature: Float64Array
  /** 1 = the 10-minute interval around counts as running, and as held below what the wind offers, as in the frame. */
  readonly running: Uint8Array
  readonly limited: Uint8Array
}

/** What the log holds of one turbine from {@link DAY_MARGIN_MS} before a day to as long after it, sorted by time. */
export interface LoggedSpan {
  readonly time: Float64Array
  /** Some of HIGH_RATE_CHANNELS. */
  readonly numbers: Readonly<Record<string, Float64Array>>
}

/** Brings logged rows of a day to the conventions of the turbine's frame, which was made of the same rows. */
export function highRateRows(frame: TurbineFrame, dayMs: number, span: LoggedSpan): HighRateRows {
  const { time, numbers } = span
  const n = time.length
  const { vaneCentreDeg, setup } = frame
  const channel = (name: (typeof HIGH_RATE_CHANNELS)[number]): Float64Array =>
    numbers[name] ?? new Float64Array(n).fill(NaN)
  const conventional = (angles: Float64Array): Float64Array => {
    const sign = setup.vane?.sign ?? 1
    return angles.map((angle) => wrap180(sign * (angle - vaneCentreDeg)))
  }
  const nacellePosition = channel('nacelle_position')
  const vane =
    frame.vaneSource === 'wind direction less nacelle position'
      ? channel('wind_direction').map((direction, i) => direction - nacellePosition[i]!)
      : channel('vane')
  const intervals = intervalsOf(frame, time)
  return {
    turbine: frame.turbine,
    dayMs,
    first: indexAtOrAfter(time, dayMs),
    end: indexAtOrAfter(time, dayMs + DAY_MS),
    sampleS: usualStepS(time),
    timeMs: time,
    windSpeed: channel('wind_speed'),
    vane: conventional(vane),
    vane2: conventional(channel('vane_2')),
    nacellePosition,
    power: channel('power'),
    pitch: channel('pitch'),
    rotorSpeed: channel('rotor_speed'),
    yawActive: channel('yaw_active'),
    airTemperature: channel('air_temperature'),
    running: Uint8Array.from(intervals, (i) => (i < 0 ? 0 : frame.running[i]!)),
    limited: Uint8Array.from(intervals, (i) => (i < 0 ? 0 : frame.limited[i]!)),
  }
}

/** The buffers of a day, each once, so that they can be handed to another thread without a copy. */
export function buffersOf(rows: HighRateRows): ArrayBuffer[] {
  const buffers = Object.values(rows as unknown as Record<string, unknown>)
    .filter((value): value is Float64Array<ArrayBuffer> => ArrayBuffer.isView(value))
    .map(({ buffer }) => buffer)
  return [...new Set(buffers)]
}

/** Index of the frame's interval that holds each row; -1 = none. */
function intervalsOf(frame: TurbineFrame, time: Float64Array): Int32Array {
  const lengthMs = frame.intervalS * 1000
  let next = time.length > 0 ? indexAtOrAfter(frame.time, time[0]! - lengthMs) : 0
  return Int32Array.from(time, (ms) => {
    while (next + 1 < frame.time.length && frame.time[next + 1]! <= ms) next++
    const start = frame.time[next] ?? NaN
    return ms >= start && ms < start + lengthMs ? next : -1
  })
}

/** First entry of rising times at or after a moment; their number when there is none. */
export function indexAtOrAfter(time: Float64Array, ms: number): number {
  let low = 0
  let high = time.length
  while (low < high) {
    const middle = (low + high) >> 1
    if (time[middle]! < ms) low = middle + 1
    else high = middle
  }
  return low
}

function usualStepS(time: Float64Array): number {
  const n = time.length
  if (n < 2) return NaN
  const steps = new Float64Array(n - 1)
  for (let i = 1; i < n; i++) steps[i - 1] = time[i]! - time[i - 1]!
  return steps.sort()[(n - 1) >> 1]! / 1000
}
