import { airDensity, REFERENCE_DENSITY } from '../kernel/wind/index.ts'
import { STOP, type Orders } from './operation.ts'
import { PURPOSE, RandomStream } from './random.ts'
import type { FarmScenario } from './scenario.ts'
import type { TurbinePlan } from './turbine-plan.ts'
import { thrustAt, wakeDeficit } from './wake.ts'
import { PAD_MIN, Reverting, type Weather } from './weather.ts'

/** What comes upon one turbine, one value a minute from the first second of the window. */
export interface Inflow {
  /** Mean wind speed with wakes, m/s. */
  speedMs: Float64Array
  /** Direction, degrees, unwrapped. */
  directionDeg: Float64Array
  /** Turbulence intensity with what wakes add. */
  turbulence: Float64Array
  /** (density / 1.225 kg/m3)^(1/3): makes a wind speed into the normalised one of the power curve. */
  densityFactor: Float64Array
  /** Factor of power: the turbine's own slow drift. */
  performance: Float64Array
}

/**
 * The farm's weather as it arrives at one turbine: later or earlier by its place along the wind, slowed by the wakes of
 * running neighbours (deficits of several wakes combined as the root of the sum of their squares). Wakes add turbulence of 0.4 times their deficit.
 */
export function turbineInflow(
  scenario: FarmScenario,
  weather: Weather,
  plans: readonly TurbinePlan[],
  orders: readonly Orders[],
  index: number,
): Inflow {
  const minutes = weather.speedMs.length - 2 * PAD_MIN
  const plan = plans[index]!
  const inflow: Inflow = {
    speedMs: new Float64Array(minutes),
    directionDeg: new Float64Array(minutes),
    turbulence: new Float64Array(minutes),
    densityFactor: new Float64Array(minutes),
    performance: new Float64Array(minutes),
  }
  const drift = new Reverting(new RandomStream(scenario.seed, PURPOSE.drift, index), 3 * 1440)
  const diameter = scenario.rotorDiameterM
  for (let i = 0; i < minutes; i++) {
    const direction = weather.directionDeg[i + PAD_MIN]!
    const towardEast = -Math.sin((direction * Math.PI) / 180)
    const towardNorth = -Math.cos((direction * Math.PI) / 180)
    const farmSpeed = Math.max(weather.speedMs[i + PAD_MIN]!, 2)
    const lateMin = (plan.eastingM * towardEast + plan.northingM * towardNorth) / farmSpeed / 60
    const at = i + PAD_MIN - Math.min(Math.max(lateMin, 1 - PAD_MIN), PAD_MIN - 1)
    const speed = between(weather.speedMs, at)
    let sumSquares = 0
    if (scenario.wakes) {
      const thrust = thrustAt(speed)
      if (thrust > 0) {
        for (const other of plans) {
          if (other === plan || orders[other.index]!.stop[i] !== STOP.none) continue
          const east = plan.eastingM - other.eastingM
          const north = plan.northingM - other.northingM
          const downstream = east * towardEast + north * towardNorth
          if (!(downstream > diameter && downstream < 40 * diameter)) continue
          sumSquares +=
            wakeDeficit(downstream, east * towardNorth - north * towardEast, diameter, thrust) ** 2
        }
      }
    }
    const deficit = Math.min(Math.sqrt(sumSquares), 0.7)
    inflow.speedMs[i] = speed * (1 - deficit)
    inflow.directionDeg[i] = between(weather.directionDeg, at)
    inflow.turbulence[i] = Math.hypot(between(weather.turbulence, at), 0.4 * deficit)
    const density = airDensity({
      pressureHpa: weather.pressureHpa[i + PAD_MIN]!,
      temperatureC: weather.temperatureC[i + PAD_MIN]!,
    })
    inflow.densityFactor[i] = Math.cbrt(density / REFERENCE_DENSITY)
    inflow.performance[i] = 1 + scenario.performanceDrift * drift.step()
  }
  return inflow
}

/** Linear between the entries of a series. */
function between(series: Float64Array, at: number): number {
  const i = Math.min(Math.floor(at), series.length - 2)
  return series[i]! + (at - i) * (series[i + 1]! - series[i]!)
}
