import { circularMedian, wrap180 } from '../kernel/angle/index.ts'
import { medianOf } from '../kernel/stats/index.ts'
import { SET_ASIDE_REASONS, type ScoringSettings, type SetAsideReason } from '../sheet/index.ts'
import type { ReasonCounts } from './frame.ts'

/** Code of a reason in `TurbineFrame.reason`; 0 is `used`. */
export const REASON_CODE = Object.fromEntries(
  SET_ASIDE_REASONS.map((reason, index) => [reason, index + 1]),
) as Readonly<Record<SetAsideReason, number>>

/** Pitch above the usual one at this wind speed from which a row counts as limited, degrees. Common practice, no source. */
const PITCH_ABOVE_USUAL_DEG = 3.5
/** A set-point below this share of rated power limits. */
const SET_POINT_SHARE = 0.99
/** Blades turned this far out of the wind do not drive the rotor, degrees. Common practice, no source. */
const PARKED_PITCH_DEG = 45
/** A rotor slower than this share of its usual running speed is idling. Common practice, no source. */
const IDLE_ROTOR_SHARE = 0.3
/** Share of the rows due in an interval below which its statistics are not taken for those of the interval. */
const COVERAGE_LEAST = 0.75

/** What the tests of one turbine look at. Arrays of length n, NaN = missing; absent channels are undefined. */
export interface SetAsideInput {
  readonly time: Float64Array
  readonly intervalMs: number
  readonly ratedPowerKw: number
  readonly windSpeed: Float64Array
  readonly vane: Float64Array
  readonly power: Float64Array
  readonly powerMin?: Float64Array | undefined
  readonly powerLimit?: Float64Array | undefined
  readonly pitch?: Float64Array | undefined
  readonly rotorSpeed?: Float64Array | undefined
  readonly nacellePosition?: Float64Array | undefined
  readonly nacelleMin?: Float64Array | undefined
  readonly nacelleMax?: Float64Array | undefined
  /** Any direction that turns with the wind: N + v, or a logged wind direction. */
  readonly direction?: Float64Array | undefined
  /** 1 = an angle of the row was averaged across the end of its scale. */
  readonly averagedAcrossNorth?: Uint8Array | undefined
  /** 1 = vane or anemometer was frozen, stuck or iced, or became so or free again within the row. */
  readonly sensorFault?: Uint8Array | undefined
  /** 1 = ... for the whole row: it has no vane, or no wind speed, that was measured. */
  readonly unmeasured?: Uint8Array | undefined
  /** Of intervals made of high-rate rows: rows that are there over rows due, 0 to 1. */
  readonly coverage?: Float64Array | undefined
  readonly status?: readonly (string | null)[] | undefined
  readonly runningStatus?: readonly string[] | undefined
  readonly availability?: readonly (string | null)[] | undefined
  /** [from, to) of windows that the site file excludes, epoch ms. */
  readonly excluded: readonly (readonly [number, number])[]
}

/** What the tests before the curve find; all of length n. */
export interface EarlySetAside {
  /** 0 = still used, else a code of REASON_CODE. */
  readonly reason: Uint8Array
  /** 1 = wind speed, vane and power are there and measured, the interval is complete, not excluded, and the turbine produces. */
  readonly running: Uint8Array
  /** 1 = held below what the wind offers, by set-point, pitch or category; whatever else holds. */
  readonly limited: Uint8Array
}

/**
 * Sets aside what says nothing about the static offset, up to the tests that need a power curve. Each row keeps the
 * first reason that holds, in the order of SET_ASIDE_REASONS. Power is never compared with the curve: that would
 * select on the very thing that is estimated.
 */
export function setAsideBeforeCurve(input: SetAsideInput, settings: ScoringSettings): EarlySetAside {
  const n = input.time.length
  const reason = new Uint8Array(n)
  const running = new Uint8Array(n)
  const limited = new Uint8Array(n)
  const set = (i: number, name: SetAsideReason): void => {
    if (reason[i] === 0) reason[i] = REASON_CODE[name]
  }
  const stopped = stoppedRows(input)
  const before = rowBefore(input)
  const after = rowAfter(before)
  const usualPitch = input.pitch ? usualPitchBySpeed(input, stopped) : undefined

  for (let i = 0; i < n; i++) {
    const averaged = input.averagedAcrossNorth?.[i] === 1
    const hasVane = !Number.isNaN(input.vane[i]!)
    const hasOthers = !Number.isNaN(input.windSpeed[i]!) && !Number.isNaN(input.power[i]!)
    const unmeasured = input.unmeasured?.[i] === 1
    if (!hasOthers || !(hasVane || averaged || unmeasured)) set(i, 'missing-channel')
    if (averaged) set(i, 'averaged-across-north')
    const incomplete = input.coverage !== undefined && !(input.coverage[i]! >= COVERAGE_LEAST)
    if (incomplete) set(i, 'incomplete-interval')
    const time = input.time[i]!
    const excluded = input.excluded.some(([from, to]) => time + input.intervalMs > from && time < to)
    if (excluded) set(i, 'excluded')
    if (stopped[i] === 1) set(i, 'not-running')
    // A bad nacelle reading leaves vane and power as they are: such a row still counts for the yaw error.
    if (hasOthers && hasVane && !unmeasured && !incomplete && !excluded && stopped[i] === 0) running[i] = 1

    const previous = before[i]!
    const next = after[i]!
    const startsOrStops = (previous >= 0 && stopped[previous] === 1) || (next >= 0 && stopped[next] === 1)
    const stopsInside = input.powerMin !== undefined && input.powerMin[i]! <= 0
    if (startsOrStops || stopsInside || yawInsideDeg(input, i, previous, next) > settings.yawMoveMaxDeg)
      set(i, 'transition')

    if (isLimited(input, i, usualPitch)) {
      limited[i] = 1
      set(i, 'limited')
    }
    if (input.sensorFault?.[i] === 1) set(i, 'sensor-fault')

    if (previous >= 0) {
      const turned = input.direction
        ? Math.abs(wrap180(input.direction[i]! - input.direction[previous]!))
        : NaN
      const gusted = Math.abs(input.windSpeed[i]! - input.windSpeed[previous]!)
      if (turned > settings.fastDirectionDeg || gusted > settings.fastSpeedMs) set(i, 'fast-change')
    }
  }
  return { reason, running, limited }
}

/**
 * Continues with the tests that need the curve and the median vane. Changes `reason` in place.
 *
 * @param range.minMs, range.maxMs  wind speeds used, m/s, both inclusive.
 * @param range.isCovered  whether the measured curve has an answer at a wind speed.
 */
export function setAsideByRange(
  reason: Uint8Array,
  normalisedSpeed: Float64Array,
  vane: Float64Array,
  range: { minMs: number; maxMs: number; vaneMaxDeg: number; isCovered: (speed: number) => boolean },
): void {
  for (let i = 0; i < reason.length; i++) {
    if (reason[i] !== 0) continue
    const speed = normalisedSpeed[i]!
    if (!(speed >= range.minMs && speed <= range.maxMs && range.isCovered(speed)))
      reason[i] = REASON_CODE['outside-wind-range']
  }
  const centre = circularMedian(vane.filter((_, i) => reason[i] === 0))
  for (let i = 0; i < reason.length; i++) {
    if (reason[i] === 0 && !(Math.abs(wrap180(vane[i]! - centre)) <= range.vaneMaxDeg)) {
      reason[i] = REASON_CODE['vane-out-of-range']
    }
  }
}

/** Rows per reason, and `used`; the counts add up to the rows. */
export function countReasons(reason: Uint8Array): ReasonCounts {
  const counts = Object.fromEntries([...SET_ASIDE_REASONS, 'used'].map((name) => [name, 0])) as Record<
    SetAsideReason | 'used',
    number
  >
  for (const code of reason) counts[code === 0 ? 'used' : SET_ASIDE_REASONS[code - 1]!]++
  return counts
}

/** 1 where the turbine does not produce: by status or category first, else by pitch, rotor and power. */
function stoppedRows(input: SetAsideInput): Uint8Array {
  const n = input.time.length
  const stopped = new Uint8Array(n)
  const running = input.runningStatus ? new Set(input.runningStatus) : undefined
  const usualRotor = input.rotorSpeed ? medianOf(input.rotorSpeed.filter((_, i) => input.power[i]! > 0)) : NaN
  for (let i = 0; i < n; i++) {
    const status = input.status?.[i] ?? null
    const byStatus = running !== undefined && status !== null && !running.has(status)
    const category = input.availability?.[i] ?? null
    const byCategory = category !== null && !/\b(full|partial)[\s_-]*performance\b/i.test(category)
    const parked = input.pitch !== undefined && input.pitch[i]! > PARKED_PITCH_DEG
    const idling = input.rotorSpeed !== undefined && input.rotorSpeed[i]! < IDLE_ROTOR_SHARE * usualRotor
    if (byStatus || byCategory || parked || idling || input.power[i]! <= 0) stopped[i] = 1
  }
  return stopped
}

/** Index of the row one interval earlier, -1 when it is not there. */
function rowBefore(input: SetAsideInput): Int32Array {
  const before = new Int32Array(input.time.length).fill(-1)
  for (let i = 1; i < before.length; i++) {
    if (Math.abs(input.time[i]! - input.time[i - 1]! - input.intervalMs) <= input.intervalMs / 10)
      before[i] = i - 1
  }
  return before
}

function rowAfter(before: Int32Array): Int32Array {
  const after = new Int32Array(before.length).fill(-1)
  for (let i = 0; i < before.length; i++) if (before[i]! >= 0) after[before[i]!] = i
  return after
}

/**
 * How far the nacelle turned inside an interval, degrees. From its lowest and highest reading where they are logged;
 * else from the means before and after: a move inside the row shows as a step on both sides of it, in one direction.
 */
function yawInsideDeg(input: SetAsideInput, i: number, previous: number, next: number): number {
  const position = input.nacellePosition
  if (!position) return 0
  if (input.nacelleMin && input.nacelleMax) {
    const span = input.nacelleMax[i]! - input.nacelleMin[i]!
    if (span >= 0 && span < 180) return span // beyond that the reading wrapped and the extremes mean nothing
  }
  if (previous < 0 || next < 0) return 0
  const first = wrap180(position[i]! - position[previous]!)
  const second = wrap180(position[next]! - position[i]!)
  const whole = first + second
  const inside = Math.min(first * Math.sign(whole), second * Math.sign(whole)) > 0.1 * Math.abs(whole)
  return inside ? Math.abs(whole) : 0
}

function isLimited(
  input: SetAsideInput,
  i: number,
  usualPitch: ((speed: number) => number) | undefined,
): boolean {
  const category = input.availability?.[i] ?? null
  if (category !== null && /\bpartial[\s_-]*performance\b/i.test(category)) return true
  if (input.powerLimit && input.powerLimit[i]! < SET_POINT_SHARE * input.ratedPowerKw) return true
  if (!input.pitch || !usualPitch) return false
  return input.pitch[i]! > usualPitch(input.windSpeed[i]!) + PITCH_ABOVE_USUAL_DEG
}

/** Median pitch of running rows by whole m/s of wind speed. */
function usualPitchBySpeed(input: SetAsideInput, stopped: Uint8Array): (speed: number) => number {
  const bySpeed = new Map<number, number[]>()
  for (let i = 0; i < stopped.length; i++) {
    const pitch = input.pitch![i]!
    const bin = Math.round(input.windSpeed[i]!)
    if (stopped[i] === 1 || Number.isNaN(pitch) || Number.isNaN(bin)) continue
    const list = bySpeed.get(bin)
    if (list) list.push(pitch)
    else bySpeed.set(bin, [pitch])
  }
  const medians = new Map([...bySpeed].map(([bin, list]) => [bin, medianOf(list)]))
  return (speed) => medians.get(Math.round(speed)) ?? Infinity
}
