import { circularMean, wrap180 } from '../../kernel/angle/index.ts'
import { medianOf, robustSd } from '../../kernel/stats/index.ts'
import type { Frame } from '../../frame/index.ts'
import { farmGrid } from '../neighbours/farm-grid.ts'
import { notTested, tested, type SensorReport } from './sensor-report.ts'

const TEST = 'a vane that reads otherwise at idle than under load'
/** Rows at idle, and under load, that a day needs to be compared with itself. */
const IDLE_ROWS = 3
const LOAD_ROWS = 12
const FEW_DAYS = 8
/** Differences that count, degrees: vanes in weak wind are loose, and a calibration at standstill is no better than that. */
const LEAST_DEG = 4
/** In standard errors of the median day. */
const BEYOND = 5
/** Wind that turns a vane at all, m/s. Common practice, no source. */
const WIND_MS = 2

/**
 * Whether the vane reads otherwise behind a rotor that stands than behind one that turns under load, whose swirl turns the
 * wind at the vane. Nacelle position plus vane is compared with the farm's direction, each day's idle rows with its rows under
 * load, so that neither north nor offset has a say.
 *
 * @param consensusDeg  wind direction of the farm on its common clock, up to a constant; degrees, NaN = not known.
 * @returns one report per turbine, in the order of the frame.
 */
export function vaneIdleBias(frame: Frame, consensusDeg: Float64Array): SensorReport[] {
  const grid = farmGrid(frame)
  return frame.turbines.map((turbine, i) => {
    const idle = new Map<number, number[]>()
    const load = new Map<number, number[]>()
    for (let t = 0; t < grid.length; t++) {
      const row = grid.row[i]![t]!
      if (row < 0) continue
      const apart = wrap180(turbine.indicatedDirection[row]! - consensusDeg[t]!)
      const power = turbine.power[row]!
      if (Number.isNaN(apart) || !(turbine.windSpeed[row]! >= WIND_MS)) continue
      // Rows in which a turbine starts or stops are neither.
      const group = turbine.running[row] === 1 ? load : power <= 0 ? idle : null
      if (group === null) continue
      const day = turbine.day[row]!
      group.set(day, [...(group.get(day) ?? []), apart])
    }
    const differences: number[] = []
    for (const [day, angles] of idle) {
      const under = load.get(day)
      if (angles.length < IDLE_ROWS || under === undefined || under.length < LOAD_ROWS) continue
      differences.push(wrap180(circularMean(angles).direction - circularMean(under).direction))
    }
    const days = differences.length
    if (days < FEW_DAYS) {
      return notTested(
        'vane',
        TEST,
        `needs nacelle position, neighbours that run meanwhile, and ${FEW_DAYS} days with rows at idle and under load; ${days} such days`,
      )
    }
    const biasDeg = medianOf(Float64Array.from(differences))
    // Of a median: 1.25 times that of a mean.
    const errorDeg = (1.2533 * robustSd(Float64Array.from(differences))) / Math.sqrt(days)
    const note = `${days} days with rows at idle and under load, against the farm’s direction; differences of ${LEAST_DEG} degrees or more`
    if (!(Math.abs(biasDeg) >= LEAST_DEG && Math.abs(biasDeg) >= BEYOND * errorDeg))
      return tested('vane', TEST, note)
    const { time, intervalS } = turbine
    return tested('vane', TEST, note, [
      {
        sensor: 'vane',
        kind: 'idle-bias',
        finding:
          `at idle the vane reads ${Math.abs(biasDeg).toFixed(1)} degrees ${biasDeg > 0 ? 'more' : 'less'} than under load, against the farm’s direction (${days} days): ` +
          'the swirl behind the turning rotor, or a vane that hangs in weak wind; a zero that was set at standstill is off by as much',
        severity: 'warn',
        howSure: 'likely',
        checkFirst:
          'At the desk: how the vane’s zero was set, at standstill or under load, and whether the controller has a table of corrections by power or rotor speed.',
        from: new Date(time[0]!).toISOString(),
        to: new Date(time[time.length - 1]! + intervalS * 1000).toISOString(),
        detail: { biasDeg, standardErrorDeg: errorDeg, days },
      },
    ])
  })
}
