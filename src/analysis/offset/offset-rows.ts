import { circularMean, RAD_PER_DEG, wrap180 } from '../../kernel/angle/index.ts'
import { powerAt, steepnessAt } from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'

/** The rows of one turbine that tell its static offset, in level groups. All arrays of length n. */
export interface OffsetRows {
  readonly days: number
  readonly cells: number
  readonly day: Int32Array
  /** Intervals since the start of the log. */
  readonly position: Int32Array
  /** The day again: noise is followed within a day only, so that days stay apart. */
  readonly chain: Int32Array
  /** Level group: wind speed by whole m/s, tercile of turbulence, day or night. */
  readonly cell: Int32Array
  /** Band of whole m/s, 0 = lowest. */
  readonly band: Int32Array
  readonly bands: number
  /** Mean vane of the rows, degrees. */
  readonly centreDeg: number
  /** Vane from that mean, radians: a vane may read anything, 180 too, when the rotor faces the wind. */
  readonly vane: Float64Array
  /** d ln P / d ln u of the measured curve at the row's wind speed. */
  readonly steepness: Float64Array
  /** ln of power over the measured curve. */
  readonly logRatio: Float64Array
}

/** Picks the used rows of a frame and puts them in level groups. */
export function offsetRows(frame: TurbineFrame, days: number): OffsetRows {
  const used: number[] = []
  for (let i = 0; i < frame.time.length; i++) if (frame.reason[i] === 0) used.push(i)
  const n = used.length
  const intervalMs = frame.intervalS * 1000
  const lowest = Math.floor(frame.windMinMs)
  const centreDeg = circularMean(used.map((i) => frame.vane[i]!)).direction
  const rows = {
    day: new Int32Array(n),
    position: new Int32Array(n),
    cell: new Int32Array(n),
    band: new Int32Array(n),
    vane: new Float64Array(n),
    steepness: new Float64Array(n),
    logRatio: new Float64Array(n),
  }
  let bands = 0
  for (let k = 0; k < n; k++) {
    const i = used[k]!
    const speed = frame.normalisedSpeed[i]!
    rows.day[k] = frame.day[i]!
    rows.position[k] = Math.round((frame.time[i]! - frame.time[0]!) / intervalMs)
    rows.band[k] = Math.floor(speed) - lowest
    rows.vane[k] = wrap180(frame.vane[i]! - centreDeg) * RAD_PER_DEG
    rows.steepness[k] = steepnessAt(frame.curve, speed)
    rows.logRatio[k] = Math.log(frame.power[i]! / powerAt(frame.curve, speed))
    bands = Math.max(bands, rows.band[k]! + 1)
  }
  const tercile = turbulenceTerciles(frame, used, rows.band, bands)
  for (let k = 0; k < n; k++) rows.cell[k] = (rows.band[k]! * 3 + tercile[k]!) * 2 + frame.night[used[k]!]!
  return { ...rows, centreDeg, days, bands, cells: bands * 6, chain: rows.day }
}

/** 0, 1, 2 by turbulence inside each band; 0 where no SD of the wind speed is logged at all, 1 where a single value is missing. */
function turbulenceTerciles(
  frame: TurbineFrame,
  used: readonly number[],
  band: Int32Array,
  bands: number,
): Uint8Array {
  const tercile = new Uint8Array(used.length)
  const byBand = Array.from({ length: bands }, (): number[] => [])
  used.forEach((i, k) => {
    if (!Number.isNaN(frame.turbulence[i]!)) byBand[band[k]!]!.push(frame.turbulence[i]!)
  })
  const edges = byBand.map((known) => {
    const sorted = Float64Array.from(known).sort()
    return [sorted[Math.floor(sorted.length / 3)], sorted[Math.floor((2 * sorted.length) / 3)]] as const
  })
  used.forEach((i, k) => {
    const [low, high] = edges[band[k]!]!
    if (low === undefined || high === undefined) return
    const value = frame.turbulence[i]!
    tercile[k] = Number.isNaN(value) ? 1 : value < low ? 0 : value < high ? 1 : 2
  })
  return tercile
}
