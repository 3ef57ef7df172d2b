import { robustSd } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'

/** A vane that spreads less than this while the turbine runs does not move with the wind, degrees. Common practice, no source. */
const STILL_VANE_DEG = 0.05
/** Fewer running rows than this say nothing about a sensor. */
const FEW_ROWS = 20

/** A channel that forbids any estimate, and why. */
export interface Block {
  readonly code: string
  readonly text: string
  readonly finding: SensorFinding
}

/** Whether wind speed, vane and power are there and alive, so that an offset can be estimated at all; null = they are. */
export function readiness(frame: TurbineFrame): Block | null {
  const n = frame.time.length
  if (n === 0) return null
  for (const [channel, sensor, values] of [
    ['vane', 'vane', frame.vaneRead],
    ['wind_speed', 'anemometer', frame.windSpeed],
    ['power', 'power', frame.power],
  ] as const) {
    if (values.every((value) => Number.isNaN(value))) {
      const text = `${channel} is missing in all ${n} rows`
      return { code: `${sensor}-missing`, text, finding: finding(frame, sensor, 'not-usable', text) }
    }
  }
  // A frozen vane takes its rows out of those that count as running.
  const running = frame.vaneRead.filter((_, i) => frame.running[i] === 1 || frame.power[i]! > 0)
  if (running.length >= FEW_ROWS && robustSd(running) < STILL_VANE_DEG) {
    const text = `the vane does not move: ${running.length} running rows spread less than ${STILL_VANE_DEG} degrees`
    return { code: 'vane-still', text, finding: finding(frame, 'vane', 'frozen', text) }
  }
  return null
}

function finding(
  frame: TurbineFrame,
  sensor: SensorFinding['sensor'],
  kind: SensorFinding['kind'],
  text: string,
): SensorFinding {
  const n = frame.time.length
  return {
    sensor,
    kind,
    finding: text,
    severity: 'fault',
    howSure: 'certain',
    checkFirst:
      kind === 'frozen'
        ? 'At the desk: read the vane live while the turbine yaws, and look at temperature and icing alarms. Only then climb.'
        : 'At the desk: see whether the channel is mapped and recorded; then whether its signal is live at the controller.',
    from: new Date(frame.time[0]!).toISOString(),
    to: new Date(frame.time[n - 1]! + frame.intervalS * 1000).toISOString(),
    detail: { rows: n },
  }
}
