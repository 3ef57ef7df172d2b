import type { Frame } from '../../frame/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import { anemometerGain } from './anemometer-gain.ts'
import { anemometerStill } from './anemometer-still.ts'
import { joinReports, type SensorReport } from './sensor-report.ts'
import { vaneFrozen } from './vane-frozen.ts'
import { farmScatter, vaneNoise, vaneScatter } from './vane-noise.ts'
import { vaneSecond } from './vane-second.ts'
import { vaneSpikes } from './vane-spikes.ts'
import { vaneSteps } from './vane-steps.ts'

/**
 * Every test of vanes and anemometers that a frame allows. Those of the vane lean on no nacelle position.
 *
 * @returns one report per turbine, in order.
 */
export function vaneAndAnemometer(frame: Frame, settings: ScoringSettings): SensorReport[] {
  const scatters = frame.turbines.map((turbine) => ({ frame: turbine, scatter: vaneScatter(turbine) }))
  const gains = anemometerGain(frame, settings)
  const scatterOfFarm = farmScatter(scatters)
  return frame.turbines.map((turbine, i) => {
    return joinReports([
      vaneFrozen(
        turbine,
        frame.turbines.filter((other) => other !== turbine),
      ),
      vaneNoise(turbine, scatters[i]!.scatter, scatters, scatterOfFarm),
      vaneSpikes(turbine),
      ...vaneSteps(turbine),
      vaneSecond(turbine),
      ...anemometerStill(turbine, frame.turbines.length),
      gains[i]!,
    ])
  })
}
