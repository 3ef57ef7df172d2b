import { medianOf } from '../../kernel/stats/index.ts'
import { wrap180 } from '../../kernel/angle/index.ts'
import type { Frame, TurbineFrame } from '../../frame/index.ts'
import type { ScoringSettings } from '../../sheet/index.ts'
import { farmDirection, type FarmDirection } from './farm-direction.ts'
import { farmGrid, onGrid, type FarmGrid, type GridChannel } from './farm-grid.ts'
import { freeStream, type FreeStream } from './free-stream.ts'

/** Wind speeds of the farm, m/s, between which anemometers are compared: somewhat wider than power is, as rows are dear. */
const COMPARED_MS = [4, 16] as const
/** Local direction stands in the regression at these distances in intervals: now, three before, one after. */
const LAGS = [-3, -2, -1, 0, 1] as const

/** Everything that comparisons between neighbours share. */
export interface FarmComparison {
  readonly grid: FarmGrid
  readonly days: number
  readonly direction: FarmDirection
  readonly free: FreeStream
  /** ln of normalised wind speed where turbines can be compared, else NaN; [i][t]. */
  readonly logSpeed: GridChannel
  /** 1 where the farm's wind is in range and steady, [t]. */
  readonly steady: Uint8Array
  /** Vane, degrees, [i][t]. */
  readonly vane: GridChannel
  /** Median wind speed of the farm, m/s, [t]; NaN with fewer than two turbines. */
  readonly farmSpeed: Float64Array
  /** Local direction at each lag, [l][i][t]; empty where no nacelle position is logged. */
  readonly localDirection: readonly GridChannel[]
  /** Median turbulence intensity of the farm, no unit, [t]; NaN where no SD of the wind speed is logged. */
  readonly turbulence: Float64Array
}

/**
 * Lays the farm on one clock and says where neighbours can be compared: running steadily, in free stream, at wind speeds
 * of the farm (not of the turbine itself) in range, while the farm's wind neither turns nor changes fast.
 */
export function farmComparison(
  farm: Pick<Frame, 'intervalS' | 'fromMs' | 'toMs' | 'turbines'>,
  days: number,
  settings: ScoringSettings,
): FarmComparison {
  const grid = farmGrid(farm)
  const direction = farmDirection(grid)
  const anySpeed = onGrid(grid, (turbine, row) =>
    turbine.running[row] === 1 ? Math.log(turbine.normalisedSpeed[row]!) : NaN,
  )
  const farmLogSpeed = Float64Array.from({ length: grid.length }, (_, t) => {
    const known = anySpeed.map((values) => values[t]!).filter((value) => Number.isFinite(value))
    return known.length >= 2 ? medianOf(known) : NaN
  })
  const free = freeStream(grid, direction, anySpeed, farmLogSpeed)
  const steady = steadyIntervals(direction.consensusDeg, farmLogSpeed, settings)
  const logSpeed = onGrid(grid, (turbine, row) =>
    runsThrough(turbine, row) ? Math.log(turbine.normalisedSpeed[row]!) : NaN,
  ).map((values, i) =>
    values.map((value, t) => (steady[t] === 1 && free[i]![t] === 1 && Number.isFinite(value) ? value : NaN)),
  )
  const hasPosition = direction.localDeg.some((values) => values.some((value) => !Number.isNaN(value)))
  return {
    grid,
    days,
    direction,
    free,
    steady,
    logSpeed,
    vane: onGrid(grid, (turbine, row) => turbine.vane[row]!),
    turbulence: mediansOver(onGrid(grid, (turbine, row) => turbine.turbulence[row]!)),
    farmSpeed: farmLogSpeed.map((value) => Math.exp(value)),
    localDirection: hasPosition ? LAGS.map((lag) => shifted(direction.localDeg, lag)) : [],
  }
}

/**
 * The turbine runs unlimited in this row and in the rows beside it, so that it neither starts nor stops inside. Yaw moves
 * do not matter here: a response that is linear in the vane is as linear in its mean.
 */
function runsThrough(turbine: TurbineFrame, row: number): boolean {
  const before = row > 0 ? turbine.running[row - 1]! : 1
  const after = turbine.running[row + 1] ?? 1
  return turbine.running[row] === 1 && turbine.limited[row] === 0 && before === 1 && after === 1
}

/** 1 where the farm's wind is in range and changes no faster than the settings allow. */
function steadyIntervals(
  directionDeg: Float64Array,
  farmLogSpeed: Float64Array,
  settings: ScoringSettings,
): Uint8Array {
  const steady = new Uint8Array(directionDeg.length)
  for (let t = 0; t < steady.length; t++) {
    const speed = Math.exp(farmLogSpeed[t]!)
    if (!(speed >= COMPARED_MS[0] && speed <= COMPARED_MS[1])) continue
    const turned = t > 0 ? Math.abs(wrap180(directionDeg[t]! - directionDeg[t - 1]!)) : 0
    const gusted = t > 0 ? Math.abs(speed - Math.exp(farmLogSpeed[t - 1]!)) : 0
    steady[t] = turned > settings.fastDirectionDeg || gusted > settings.fastSpeedMs ? 0 : 1
  }
  return steady
}

/** What stands `lag` intervals later (earlier for a negative lag). */
function shifted(values: GridChannel, lag: number): GridChannel {
  return values.map((series) => series.map((_, t) => series[t + lag] ?? NaN))
}

/** Median over turbines at each interval. */
function mediansOver(values: GridChannel): Float64Array {
  return Float64Array.from(values[0] ?? [], (_, t) => medianOf(values.map((series) => series[t]!)))
}
