import { medianOf, robustSd } from '../../kernel/stats/index.ts'
import type { Frame, TurbineFrame } from '../../frame/index.ts'
import type { ScoringSettings, SensorFinding } from '../../sheet/index.ts'
import { farmComparison, type FarmComparison } from '../neighbours/farm-comparison.ts'
import type { GridChannel } from '../neighbours/farm-grid.ts'
import { SPOILS } from './anemometer-still.ts'
import { levelSteps, type LevelHistory } from './level-steps.ts'
import { joinReports, notTested, tested, type SensorReport } from './sensor-report.ts'

const GAIN_TEST = 'gain against neighbours, by sector'
const DRIFT_TEST = 'gain that drifts or steps'
/** Fewer turbines than this have no majority. */
const FEWEST_TURBINES = 3
/** From so many on the farm's own spread of gains is known. */
const ENOUGH_FOR_SPREAD = 5
const SECTOR_DEG = 30
const SECTORS = 360 / SECTOR_DEG
/** Rows without which a turbine, or a sector, says nothing of its gain. */
const FEW_ROWS = 300
const FEW_IN_SECTOR = 40
/** A gain this far off is told, and one from which somebody should look, relative; terrain alone makes half of that. */
const TOLD = 0.06
const OFF = 0.1
/** ... and this many SDs of the farm's gains, since terrain differs. */
const OFF_SDS = 4
/** A change of gain that counts, relative: 1 % in wind speed is 2 to 6 % in power below rated. */
const LEAST_CHANGE = 0.03

const REFINED_ROUNDS = 4

/** An anemometer against its neighbours. */
interface Gain {
  /** ln of own reading less that of the neighbours, level of the sector taken out; [t]. */
  readonly rest: Float64Array
  /** Reading over that of the neighbours, mean of sectors; NaN with too few rows. */
  readonly gain: number
  readonly bySector: readonly { fromDeg: number; gain: number; rows: number }[]
  readonly rows: number
}

/**
 * Gain of each anemometer against the median of the others at the same time, in free stream, and when it changed. Power
 * plays no part. One that changed is left out of the others' median, and the rest judged again.
 *
 * @returns one report per turbine, in order.
 */
export function anemometerGain(frame: Frame, settings: ScoringSettings): SensorReport[] {
  const turbines = frame.turbines
  if (turbines.length < FEWEST_TURBINES) {
    const missing = `needs ${FEWEST_TURBINES} turbines`
    return turbines.map(() =>
      joinReports([GAIN_TEST, DRIFT_TEST].map((test) => notTested('anemometer', test, missing))),
    )
  }
  const comparison = farmComparison(frame, frame.calendar.days, settings)
  const bad = new Set<number>()
  let gains: Gain[] = []
  let histories: LevelHistory[] = []
  for (let round = 0; round <= Math.ceil(turbines.length / 3); round++) {
    gains = turbines.map((_, i) => gainOf(comparison, i, bad))
    histories = gains.map(({ rest }) => historyOf(rest, frame))
    const sizes = histories.map((history, i) => (bad.has(i) ? 0 : rangeOf(history)))
    const worst = sizes.indexOf(Math.max(...sizes))
    if (!(sizes[worst]! > 0)) break
    bad.add(worst)
  }
  for (const i of bad) {
    // Sectors that blew before or after the change alone hide a part of it in their levels.
    for (let round = 0; round < REFINED_ROUNDS; round++) {
      const { steps } = histories[i]!
      const shift = (t: number): number => {
        const ms = frame.fromMs + t * frame.intervalS * 1000
        const last = steps.filter(({ atMs }) => atMs <= ms).at(-1)
        return last ? last.after - steps[0]!.before : 0
      }
      gains[i] = gainOf(comparison, i, bad, shift)
      const refined = historyOf(gains[i].rest, frame)
      if (refined.steps.length > 0) histories[i] = refined
    }
  }
  const known = gains.map(({ gain }) => gain).filter((gain) => !Number.isNaN(gain))
  const centre = medianOf(known)
  const spread =
    known.length >= ENOUGH_FOR_SPREAD ? robustSd(known.map((gain) => Math.log(gain / centre))) : 0
  return turbines.map((turbine, i) =>
    joinReports([gainReport(turbine, gains[i]!, centre, spread), driftReport(gains[i]!, histories[i]!)]),
  )
}

function gainOf(
  comparison: FarmComparison,
  i: number,
  bad: ReadonlySet<number>,
  shift: (t: number) => number = () => 0,
): Gain {
  const { logSpeed, grid, direction } = comparison
  const others = logSpeed.filter((_, j) => j !== i && !bad.has(j))
  const sector = (t: number): number => {
    const angle = direction.consensusDeg[t]!
    return Number.isNaN(angle) ? 0 : Math.floor(angle / SECTOR_DEG) % SECTORS
  }
  const rest = new Float64Array(grid.length).fill(NaN)
  const lists = Array.from({ length: SECTORS }, (): number[] => [])
  let rows = 0
  for (let t = 0; t < grid.length; t++) {
    rest[t] = logSpeed[i]![t]! - medianAt(others, t)
    if (Number.isNaN(rest[t]!)) continue
    lists[sector(t)]!.push(rest[t]! - shift(t))
    rows++
  }
  const levels = lists.map((list) => (list.length >= FEW_IN_SECTOR ? medianOf(list) : NaN))
  for (let t = 0; t < grid.length; t++) rest[t]! -= levels[sector(t)]!
  const bySector = levels.flatMap((level, s) =>
    Number.isNaN(level) ? [] : [{ fromDeg: s * SECTOR_DEG, gain: Math.exp(level), rows: lists[s]!.length }],
  )
  const gain = rows >= FEW_ROWS && bySector.length > 0 ? Math.exp(medianOf(levels)) : NaN
  return { rest, gain, bySector, rows }
}

/** Median of the others at one time; NaN with fewer than two. */
function medianAt(others: GridChannel, t: number): number {
  const known: number[] = []
  for (const series of others) if (!Number.isNaN(series[t]!)) known.push(series[t]!)
  if (known.length < 2) return NaN
  known.sort((a, b) => a - b)
  const middle = known.length >> 1
  return known.length % 2 === 1 ? known[middle]! : (known[middle - 1]! + known[middle]!) / 2
}

function historyOf(rest: Float64Array, frame: Frame): LevelHistory {
  const intervalMs = frame.intervalS * 1000
  const time = Float64Array.from(rest, (_, t) => frame.fromMs + t * intervalMs)
  return levelSteps(time, rest, { intervalMs, leastSize: Math.log(1 + LEAST_CHANGE) })
}

function rangeOf({ steps }: LevelHistory): number {
  return steps.reduce((most, { before, after }) => Math.max(most, Math.abs(after - before)), 0)
}

function gainReport(turbine: TurbineFrame, own: Gain, centre: number, spread: number): SensorReport {
  if (Number.isNaN(own.gain)) {
    return notTested(
      'anemometer',
      GAIN_TEST,
      `needs ${FEW_ROWS} rows in free stream beside two neighbours; there are ${own.rows}`,
    )
  }
  const relative = own.gain / centre
  const off = Math.abs(Math.log(relative))
  const note = `${own.rows} rows in free stream, ${own.bySector.length} sectors of ${SECTOR_DEG} degrees`
  const isOff = off >= Math.max(OFF, OFF_SDS * spread)
  if (!isOff && off < TOLD) return tested('anemometer', GAIN_TEST, note)
  const percent = Math.round(1000 * Math.abs(relative - 1)) / 10
  const finding: SensorFinding = {
    sensor: 'anemometer',
    kind: 'gain-off',
    finding: `the anemometer reads ${percent.toFixed(1)} % ${relative < 1 ? 'less' : 'more'} than its neighbours in free stream${isOff ? '' : '; terrain may do as much'}`,
    severity: isOff ? 'warn' : 'info',
    howSure: 'possible',
    checkFirst:
      'At the desk: calibration factors and nacelle transfer function of this turbine against those of its neighbours; terrain at its place.',
    from: new Date(turbine.time[0]!).toISOString(),
    to: null,
    detail: {
      gain: relative,
      bySector: own.bySector,
      spreadOfFarm: spread,
      spoils: 'power curve and energy; a constant gain leaves the static offset as it is',
    },
  }
  return tested('anemometer', GAIN_TEST, note, [finding])
}

function driftReport(own: Gain, history: LevelHistory): SensorReport {
  if (history.bins < 8) {
    return notTested('anemometer', DRIFT_TEST, 'needs two days in free stream beside two neighbours, or more')
  }
  const { steps } = history
  const note = `${history.bins} spells of six hours; changes of ${100 * LEAST_CHANGE} % or more`
  if (steps.length === 0) return tested('anemometer', DRIFT_TEST, note)
  const change = Math.exp(history.last - history.first) - 1
  const date = new Date(steps[0]!.atMs).toISOString().slice(0, 16).replace('T', ' ')
  const finding: SensorFinding = {
    sensor: 'anemometer',
    kind: 'gain-drift',
    finding:
      steps.length === 1
        ? `from about ${date} UTC on the anemometer reads ${percentOf(change)} than before, against its neighbours`
        : `against its neighbours the anemometer's reading changed in ${steps.length} steps from ${date} UTC on; in the end it reads ${percentOf(change)} than at first`,
    severity: 'warn',
    howSure: 'likely',
    checkFirst:
      'At the desk: whether anemometer, its factors or the nacelle transfer function were changed on that day; heating and icing alarms. Then the bearing.',
    from: new Date(steps[0]!.interval[0]).toISOString(),
    to: null,
    detail: {
      change,
      steps: steps.map((step) => ({
        at: new Date(step.atMs).toISOString(),
        change: Math.exp(step.after - step.before) - 1,
      })),
      rows: own.rows,
      spoils: SPOILS,
    },
  }
  return tested('anemometer', DRIFT_TEST, note, [finding])
}

function percentOf(change: number): string {
  return `${(100 * Math.abs(change)).toFixed(1)} % ${change < 0 ? 'less' : 'more'}`
}
