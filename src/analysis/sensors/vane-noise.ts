import { medianOf, quantileOf } from '../../kernel/stats/index.ts'
import { wrap180 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'
import { levelSteps, type LevelStep } from './level-steps.ts'
import { notTested, tested, type SensorReport } from './sensor-report.ts'

const TEST = 'noise floor and damping changed at a date'
/** Cells of wind speed and of turbulence in which a vane has a usual scatter. */
const SPEED_CELLS = 6
const TURBULENCE_CELLS = 6
/** Rows without which a cell says nothing. */
const FEW_IN_CELL = 20
/** Changes of the scatter that count, as a factor: of the SD inside the interval, and of row against row. */
const LEAST_FACTOR = 1.25
const LEAST_FACTOR_OF_ROWS = 1.6
/** Scatter below this is rounding, degrees. */
const LEAST_SCATTER_DEG = 0.02

/** The scatter of a vane as it compares with what its wind speed and turbulence let expect: ln, length n; NaN = none. */
export interface VaneScatter {
  readonly source: 'sd' | 'rows' | 'none'
  readonly relative: Float64Array
  readonly usualDeg: number
}

/**
 * Scatter of the vane of running rows: its SD inside the interval where that is logged, else the change from row to row. The
 * level of its cell of wind speed and turbulence is taken out.
 */
export function vaneScatter(frame: TurbineFrame): VaneScatter {
  const n = frame.time.length
  const known = (value: number): boolean => value > LEAST_SCATTER_DEG
  const hasSd = frame.vaneSd.some(known)
  const scatter = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    const runs = frame.running[i] === 1
    const value = hasSd
      ? frame.vaneSd[i]!
      : frame.running[i - 1] === 1
        ? Math.abs(wrap180(frame.vane[i]! - frame.vane[i - 1]!))
        : NaN
    scatter[i] = runs && known(value) ? Math.log(value) : NaN
  }
  const source = hasSd ? 'sd' : frame.vaneSource === 'vane' ? 'rows' : 'none'
  return {
    source,
    usualDeg: Math.exp(medianOf(scatter)),
    relative: withoutCells(scatter, frame),
  }
}

/** Whether the scatter of a vane changed for good at some date: lost damping, a worn bearing, another sensor. */
export function vaneNoise(
  frame: TurbineFrame,
  own: VaneScatter,
  all: readonly { frame: TurbineFrame; scatter: VaneScatter }[],
  farm: FarmScatter,
): SensorReport {
  if (own.source === 'none' || frame.vaneSource !== 'vane') {
    return notTested('vane', TEST, 'needs a logged vane')
  }
  // Vanes of other logs are compared with only when theirs is measured in the same way.
  const alike = all.filter(({ scatter }) => scatter.source === own.source).length - 1
  const compared = alike >= 2 && alike === all.length - 1
  const factor = own.source === 'sd' ? LEAST_FACTOR : LEAST_FACTOR_OF_ROWS
  const history = levelSteps(frame.time, compared ? againstOthers(frame, own, farm) : own.relative, {
    intervalMs: frame.intervalS * 1000,
    leastSize: Math.log(factor),
  })
  const what =
    own.source === 'sd' ? 'SD inside the interval' : 'change from row to row (vane_sd would tell more)'
  const note = `${what}, ${compared ? `against ${alike} neighbours` : 'no neighbours to compare with'}; a factor of ${factor} or more over a day or more`
  if (history.bins < 8) return notTested('vane', TEST, 'needs two days of running rows or more')
  return tested(
    'vane',
    TEST,
    note,
    history.steps.map((step) => findingOf(step, own)),
  )
}

/** The relative scatter of all vanes of a farm at each time. */
export type FarmScatter = ReadonlyMap<number, readonly number[]>

export function farmScatter(all: readonly { frame: TurbineFrame; scatter: VaneScatter }[]): FarmScatter {
  const byTime = new Map<number, number[]>()
  for (const { frame, scatter } of all) {
    scatter.relative.forEach((value, i) => {
      if (Number.isNaN(value)) return
      const list = byTime.get(frame.time[i]!)
      if (list) list.push(value)
      else byTime.set(frame.time[i]!, [value])
    })
  }
  return byTime
}

/** Own scatter less the median of the others' at the same time; NaN where fewer than two are known. */
function againstOthers(frame: TurbineFrame, own: VaneScatter, farm: FarmScatter): Float64Array {
  return own.relative.map((value, i) => {
    const known = farm.get(frame.time[i]!)
    if (Number.isNaN(value) || known === undefined || known.length < 3) return NaN
    const others = known.slice()
    others.splice(others.indexOf(value), 1)
    others.sort((a, b) => a - b)
    const middle = others.length >> 1
    return value - (others.length % 2 === 1 ? others[middle]! : (others[middle - 1]! + others[middle]!) / 2)
  })
}

function withoutCells(scatter: Float64Array, frame: TurbineFrame): Float64Array {
  const cell = cellsOf(scatter, frame)
  const lists = new Map<number, number[]>()
  cell.forEach((c, i) => {
    if (c < 0) return
    const list = lists.get(c)
    if (list) list.push(scatter[i]!)
    else lists.set(c, [scatter[i]!])
  })
  const levels = new Map<number, number>()
  for (const [c, list] of lists) if (list.length >= FEW_IN_CELL) levels.set(c, medianOf(list))
  return scatter.map((value, i) => value - (levels.get(cell[i]!) ?? NaN))
}

function cellsOf(scatter: Float64Array, frame: TurbineFrame): Int32Array {
  const speedEdges = edgesOf(frame.windSpeed, scatter, SPEED_CELLS)
  const hasTurbulence = frame.turbulence.some((value) => !Number.isNaN(value))
  const turbulenceEdges = hasTurbulence ? edgesOf(frame.turbulence, scatter, TURBULENCE_CELLS) : []
  return Int32Array.from(scatter, (value, i) => {
    if (Number.isNaN(value) || Number.isNaN(frame.windSpeed[i]!)) return -1
    if (hasTurbulence && Number.isNaN(frame.turbulence[i]!)) return -1
    const at = (edges: readonly number[], x: number): number => edges.filter((edge) => x >= edge).length
    return at(speedEdges, frame.windSpeed[i]!) * TURBULENCE_CELLS + at(turbulenceEdges, frame.turbulence[i]!)
  })
}

function edgesOf(values: Float64Array, scatter: Float64Array, cells: number): number[] {
  const known = values.filter((_, i) => !Number.isNaN(scatter[i]!))
  return Array.from({ length: cells - 1 }, (_, k) => quantileOf(known, (k + 1) / cells))
}

function findingOf(step: LevelStep, own: VaneScatter): SensorFinding {
  const factor = Math.exp(step.after - step.before)
  const date = new Date(step.atMs).toISOString().slice(0, 16).replace('T', ' ')
  const louder = factor > 1
  return {
    sensor: 'vane',
    kind: 'noise-changed',
    finding: `from ${date} UTC on the vane scatters ${louder ? `${factor.toFixed(2)} times as much` : `only ${factor.toFixed(2)} times as much`} as before in like wind (usual ${own.usualDeg.toFixed(1)} degrees ${own.source === 'sd' ? 'inside the interval' : 'from row to row'}): ${louder ? 'lost damping, a loose vane, or another sensor' : 'more friction, ice, a filter that was changed, or another sensor'}`,
    severity: 'warn',
    howSure: 'likely',
    checkFirst:
      'At the desk: whether vane, cable or the controller’s filter was changed on that day. Then a photograph of the vane, and its play by hand.',
    from: new Date(step.interval[0]).toISOString(),
    to: null,
    detail: {
      at: new Date(step.atMs).toISOString(),
      factor,
      within: step.interval.map((ms) => new Date(ms).toISOString()),
      measuredBy: own.source === 'sd' ? 'vane_sd' : 'change of the vane from row to row',
    },
  }
}
