import { buildFrame, type Frame, type TurbineColumns } from '../../../src/frame/index.ts'
import { SETTINGS } from '../../frame/settings.ts'
import { normals } from '../../kernel/stats/normals.ts'
import { RAD } from '../synthetic.ts'

const ROWS_PER_DAY = 144
export const FIRST_MS = Date.parse('2026-01-01T00:00:00Z')
export const DAY_MS = 86_400_000

/** What one turbine is; functions take the time in days since the start. */
export interface Made {
  /** d. */
  offsetDeg?: (day: number) => number
  /** n. */
  northDeg?: (day: number) => number
  /** False: no nacelle position in the log. */
  position?: boolean
  vaneSdDeg?: number
  /** SD of ln P. */
  noise?: number
}

/**
 * Turbines in one wind whose direction wanders: the vane is drawn, the nacelle stands where N + v = direction - d + n with local
 * noise of 2 degrees, power is that of the cosine law with p = 3 and a curve of exponent 3.
 */
export function madeFarm(days: number, turbines: readonly Made[], seed = 1): Frame {
  const weather = normals(seed)
  const n = days * ROWS_PER_DAY
  const direction = new Float64Array(n)
  const speed = new Float64Array(n)
  let turn = 200
  let gust = 0
  for (let i = 0; i < n; i++) {
    direction[i] = turn += 1.5 * weather()
    gust = 0.9 * gust + 0.3 * weather()
    speed[i] = Math.min(11.5, Math.max(4.5, 8 + 2.4 * Math.sin(i / 50) + gust))
  }
  const columns = turbines.map((made, k): TurbineColumns => {
    const draw = normals(seed * 100 + k + 1)
    const { offsetDeg = () => 0, northDeg = () => 0, position = true, vaneSdDeg = 4, noise = 0.02 } = made
    const numbers = Object.fromEntries(
      ['wind_speed', 'vane', 'power', 'nacelle_position'].map((name) => [name, new Float64Array(n)]),
    )
    const time = new Float64Array(n)
    for (let i = 0; i < n; i++) {
      const day = i / ROWS_PER_DAY
      const vane = Math.max(-12, Math.min(12, vaneSdDeg * draw()))
      const d = offsetDeg(day)
      const heading = direction[i]! + 2 * draw() - vane - d + northDeg(day)
      time[i] = FIRST_MS + day * DAY_MS
      numbers['vane']![i] = vane
      numbers['wind_speed']![i] = speed[i]!
      numbers['power']![i] = 2 * (speed[i]! * Math.cos((vane + d) * RAD)) ** 3 * Math.exp(noise * draw())
      numbers['nacelle_position']![i] = position ? ((heading % 360) + 360) % 360 : NaN
    }
    return { turbine: `T${k + 1}`, time, numbers, texts: {} }
  })
  return buildFrame(columns, {
    site: { turbines: columns.map(({ turbine }) => ({ turbine, ratedPowerKw: 5000 })) },
    settings: { ...SETTINGS, assumedResponsePctPerDeg: 0 },
    intervalS: 600,
  })
}

/** Another value from a day on. */
export const stepAt =
  (day: number, before: number, after: number) =>
  (at: number): number =>
    at >= day ? after : before
