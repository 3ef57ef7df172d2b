import type { SizedFault } from './faults.ts'
import type { FarmScenario } from './scenario.ts'
import type { YawBehaviour } from './yaw-controller.ts'

/** A controller that hunts follows the mean of so many seconds. */
const HUNTING_AVERAGE_S = 20
const HUNTING_HOLD_S = 5

/** How a turbine yaws at a second of the scenario, with what is wrong with it then. */
export function yawBehaviour(
  scenario: FarmScenario,
  faults: readonly SizedFault[] = [],
  second = 0,
): YawBehaviour {
  const { yawAverageS, yawThresholdDeg, yawHoldS, yawStopDeg, yawRateDegS } = scenario
  const behaviour: YawBehaviour = {
    averageS: yawAverageS,
    clockwiseThresholdDeg: yawThresholdDeg,
    counterThresholdDeg: yawThresholdDeg,
    holdS: yawHoldS,
    stopDeg: yawStopDeg,
    coastDeg: 0,
    rateDegS: yawRateDegS,
    sector: null,
    untwists: true,
  }
  for (const { kind, size, place, fromS, toS } of faults) {
    if (!(fromS <= second && second < toS)) continue
    if (kind === 'yaw-slow') behaviour.rateDegS *= size!
    if (kind === 'yaw-overshoot') behaviour.coastDeg = size!
    if (kind === 'yaw-unbalanced') behaviour.counterThresholdDeg *= size!
    if (kind === 'yaw-wide-threshold') {
      behaviour.clockwiseThresholdDeg *= size!
      behaviour.counterThresholdDeg *= size!
    }
    if (kind === 'yaw-hunting') {
      behaviour.averageS = HUNTING_AVERAGE_S
      behaviour.holdS = HUNTING_HOLD_S
      behaviour.clockwiseThresholdDeg = behaviour.counterThresholdDeg = size!
    }
    if (kind === 'yaw-deliberate') behaviour.sector = { middleDeg: place!, vaneDeg: size! }
    if (kind === 'yaw-no-untwist') behaviour.untwists = false
  }
  return behaviour
}

/** Seconds at which the behaviour changes, besides the first. */
export function behaviourChanges(faults: readonly SizedFault[]): number[] {
  return faults.flatMap(({ kind, fromS, toS }) => (kind.startsWith('yaw-') ? [fromS, toS] : []))
}
