import { buildFrame, type Frame } from '../../../src/frame/index.ts'
import { dayBlocks, compareNeighbours, type Neighbours } from '../../../src/analysis/index.ts'
import { SETTINGS } from '../../frame/settings.ts'
import { normals } from '../../kernel/stats/normals.ts'

const TEN_MINUTES = 600_000
const START = Date.parse('2026-01-01T00:00:00Z')
export const DAYS = 20
export const TURBINES = 6

export interface SyntheticFarm {
  /** ln of the reading of turbine i that its vane, degrees, adds at a wind speed of the farm, m/s. */
  readonly response: (i: number, vane: number, speed: number) => number
  /** SD of ln of local wind speed. */
  readonly localSd?: number
  /** Local speed moves with local direction: ln per degree of direction that the nacelle has not followed. */
  readonly linkPerDeg?: number
  /** ln of the wind speed of turbine i in a wind from a direction, degrees, less that of the farm. */
  readonly wake?: (i: number, directionDeg: number) => number
  readonly withPosition?: boolean
}

/**
 * A farm whose wind turns through all sectors; turbines stand some degrees off as their nacelles lag (4 degrees rms) and as
 * local direction does (2 degrees rms), which all are new in every row.
 */
export function syntheticFarm(farm: SyntheticFarm): Frame {
  const { localSd = 0.02, linkPerDeg = 0, wake = () => 0, withPosition = true } = farm
  const draw = normals(11)
  const n = DAYS * 144
  const direction = new Float64Array(n)
  const speed = new Float64Array(n)
  for (let t = 0; t < n; t++) {
    direction[t] = (360 + t / 2 + 20 * Math.sin(t / 40)) % 360
    speed[t] = 8 + 3 * Math.sin(t / 55) + 0.2 * draw()
  }
  const time = Float64Array.from({ length: n }, (_, t) => START + t * TEN_MINUTES)
  const turbines = Array.from({ length: TURBINES }, (_, i) => {
    const wind = new Float64Array(n)
    const vane = new Float64Array(n)
    const position = new Float64Array(n)
    const power = new Float64Array(n)
    for (let t = 0; t < n; t++) {
      const veer = 2 * draw()
      const lag = 4 * draw()
      vane[t] = veer + lag
      position[t] = (((direction[t]! - lag) % 360) + 360) % 360
      const local = speed[t]! * Math.exp(localSd * draw() + linkPerDeg * veer + wake(i, direction[t]!))
      wind[t] = local * Math.exp(farm.response(i, vane[t]!, speed[t]!))
      power[t] = 2 * local ** 3
    }
    const numbers = { wind_speed: wind, vane, power }
    return {
      turbine: `T${i + 1}`,
      time,
      numbers: withPosition ? { ...numbers, nacelle_position: position } : numbers,
      texts: {},
    }
  })
  const site = {
    turbines: turbines.map(({ turbine }) => ({ turbine, model: 'M', ratedPowerKw: 50_000 })),
  }
  return buildFrame(turbines, { site, settings: SETTINGS, intervalS: 600 })
}

export function comparedFarm(frame: Frame): Neighbours | null {
  const days = frame.calendar.days
  return compareNeighbours(frame, days, dayBlocks(days, SETTINGS), SETTINGS)
}
