import type { Frame } from '../../frame/index.ts'
import { anemometerStill } from './anemometer-still.ts'
import { joinReports, type SensorReport } from './sensor-report.ts'
import { vaneFrozen } from './vane-frozen.ts'

/**
 * Every test of vanes and anemometers that a frame allows.
 *
 * @returns one report per turbine, in order.
 */
export function vaneAndAnemometer(frame: Frame): SensorReport[] {
  return frame.turbines.map((turbine) => {
    const others = frame.turbines.filter((other) => other !== turbine)
    return joinReports([vaneFrozen(turbine, others), ...anemometerStill(turbine, frame.turbines.length)])
  })
}
