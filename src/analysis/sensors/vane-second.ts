import { circularMedian, wrap180 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'
import { levelSteps } from './level-steps.ts'
import { notTested, tested, type SensorReport } from './sensor-report.ts'

const TEST = 'two vanes drift apart'
/** Changes of the difference that count, degrees: a degree of misalignment is what an offset is judged by. */
const LEAST_DEG = 1
/** A constant difference from which it is told, degrees. */
const CONSTANT_DEG = 3
const WIND_MS = 3

/** Whether the two vanes of a turbine keep their distance. Which of them moved, power and neighbours tell. */
export function vaneSecond(frame: TurbineFrame): SensorReport {
  const difference = frame.vane.map((value, i) =>
    frame.windSpeed[i]! >= WIND_MS ? wrap180(frame.vane2[i]! - value) : NaN,
  )
  if (frame.vane2.every((value) => Number.isNaN(value))) return notTested('vane', TEST, 'needs vane_2')
  const usual = wrap180(circularMedian(difference))
  const history = levelSteps(
    frame.time,
    difference.map((value) => wrap180(value - usual)),
    { intervalMs: frame.intervalS * 1000, leastSize: LEAST_DEG },
  )
  if (history.bins < 8) return notTested('vane', TEST, 'needs two days with both vanes or more')
  const note = `vane_2 minus vane over ${history.bins} spells of six hours; changes of ${LEAST_DEG} degree or more`
  const first = wrap180(usual + history.first)
  const last = wrap180(usual + history.last)
  const { steps } = history
  if (steps.length === 0) {
    return tested('vane', TEST, note, Math.abs(usual) >= CONSTANT_DEG ? [constantFinding(frame, usual)] : [])
  }
  const moved = wrap180(last - first)
  const finding: SensorFinding = {
    sensor: 'vane',
    kind: 'two-vanes-apart',
    finding: `vane_2 minus vane went from ${first.toFixed(1)} to ${last.toFixed(1)} degrees${steps.length === 1 ? ` about ${dateOf(steps[0]!.atMs)} UTC` : ` in ${steps.length} steps from ${dateOf(steps[0]!.atMs)} UTC on`}: one of the two turned on its mount, or was changed`,
    severity: 'warn',
    howSure: 'certain',
    checkFirst:
      'At the desk: which vane the controller uses, and whether its offset parameter was changed on that day; then photographs of both marks.',
    from: new Date(steps[0]!.interval[0]).toISOString(),
    to: null,
    detail: {
      firstDeg: first,
      lastDeg: last,
      movedDeg: moved,
      steps: steps.map((step) => ({
        at: new Date(step.atMs).toISOString(),
        fromDeg: wrap180(usual + step.before),
        toDeg: wrap180(usual + step.after),
      })),
      whichOne: 'the difference alone does not tell; a change of the static offset on the same day does',
    },
  }
  return tested('vane', TEST, note, [finding])
}

function constantFinding(frame: TurbineFrame, usual: number): SensorFinding {
  return {
    sensor: 'vane',
    kind: 'two-vanes-apart',
    finding: `vane_2 reads ${Math.abs(usual).toFixed(1)} degrees ${usual > 0 ? 'more' : 'less'} than vane throughout: at least one of them is off its mark, or has a correction of its own`,
    severity: 'info',
    howSure: 'certain',
    checkFirst: 'At the desk: the offset parameters of both vanes; then photographs of both marks.',
    from: new Date(frame.time[0]!).toISOString(),
    to: null,
    detail: { differenceDeg: usual },
  }
}

function dateOf(ms: number): string {
  return new Date(ms).toISOString().slice(0, 16).replace('T', ' ')
}
