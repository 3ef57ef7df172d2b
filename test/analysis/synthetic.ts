import { buildFrame, type TurbineColumns, type TurbineFrame } from '../../src/frame/index.ts'
import { dayBlocks, staticOffset, type StaticOffsetAnswer } from '../../src/analysis/index.ts'
import type { ScoringSettings, SiteFile } from '../../src/sheet/index.ts'
import { SETTINGS } from '../frame/settings.ts'
import { normals } from '../kernel/stats/normals.ts'

export const RAD = Math.PI / 180
const TEN_MINUTES = 600_000

/** The power law that synthetic rotors follow below rated: ln P = ln C + K ln u, so that the cosine law is exact. */
const STEEPNESS = 3
const KW_AT_ONE = 2

export interface Synthetic {
  days?: number
  /** d. */
  offsetDeg?: number
  /** p. */
  exponent?: number
  /** a, relative change of the reading per degree of vane. */
  responsePerDeg?: number
  /** SD of ln P. */
  noise?: number
  /** SD of a level of ln P that all rows of a day share. */
  dayNoise?: number
  meanVaneDeg?: number
  vaneSdDeg?: number
  seed?: number
}

/**
 * Rows whose power follows the model without an approximation: u is drawn, power is C (u cos(v + d)^(p/3))^3, and the
 * anemometer reads u (1 + a v). Wind changes slowly, the vane at random.
 */
export function syntheticColumns(options: Synthetic = {}): TurbineColumns {
  const {
    days = 10,
    offsetDeg = 0,
    exponent = 3,
    responsePerDeg = 0,
    noise = 0,
    dayNoise = 0,
    seed = 1,
  } = options
  const { meanVaneDeg = 0, vaneSdDeg = 4 } = options
  const draw = normals(seed)
  const n = days * 144
  const time = new Float64Array(n)
  const wind = new Float64Array(n)
  const vane = new Float64Array(n)
  const power = new Float64Array(n)
  let level = 0
  let gust = 0
  for (let i = 0; i < n; i++) {
    if (i % 144 === 0) level = dayNoise * draw()
    gust = 0.9 * gust + 0.3 * draw()
    // Turned back at the ends, not cut: an anemometer that repeats itself counts as stuck.
    const drawn = 8 + 2.4 * Math.sin(i / 50) + gust
    const speed = drawn > 11.5 ? 23 - drawn : drawn < 4.5 ? 9 - drawn : drawn
    time[i] = Date.parse('2026-01-01T00:00:00Z') + i * TEN_MINUTES
    vane[i] = meanVaneDeg + Math.max(-12, Math.min(12, vaneSdDeg * draw()))
    const faced = Math.cos((vane[i]! + offsetDeg) * RAD) ** (exponent / 3)
    power[i] = KW_AT_ONE * (speed * faced) ** STEEPNESS * Math.exp(noise * draw() + level)
    wind[i] = speed * (1 + responsePerDeg * vane[i]!)
  }
  return { turbine: 'T1', time, numbers: { wind_speed: wind, vane, power }, texts: {} }
}

/** Rated power far above the rows, so that the curve has no knee and nothing is capped. */
export const SITE: SiteFile = { turbines: [{ turbine: 'T1', ratedPowerKw: 5000 }] }

export function frameOf(columns: TurbineColumns, settings: ScoringSettings = SETTINGS, site = SITE) {
  const frame = buildFrame([columns], { site, settings, intervalS: 600 })
  return { frame: frame.turbines[0]!, days: frame.calendar.days }
}

export function offsetOf(columns: TurbineColumns, change: Partial<ScoringSettings> = {}): StaticOffsetAnswer {
  const settings = { ...SETTINGS, assumedResponsePctPerDeg: 0, ...change }
  const { frame, days } = frameOf(columns, settings)
  return answerOf(frame, days, settings)
}

export function answerOf(frame: TurbineFrame, days: number, settings: ScoringSettings): StaticOffsetAnswer {
  return staticOffset(frame, { settings, dayWeights: dayBlocks(days, settings), days })
}
