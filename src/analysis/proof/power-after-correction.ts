import { medianOf } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import { onGrid, type GridChannel } from '../neighbours/farm-grid.ts'
import { curveBothWays, type CurveBothWays } from './implied-speed.ts'
import { judgedStep, sideOf, type JudgedStep } from './judged-step.ts'
import { sectorsOf, type ProofFarm, type ProofQuestion } from './proof-farm.ts'
import { stepWithinCells } from './step-within-cells.ts'

/** Sectors with levels of their own, degrees: wakes are narrow. On simulated farms 10 did better than 5, 15 and 30. */
const SECTOR_DEG = 10
const SECTORS = 360 / SECTOR_DEG
/** Sectors as they are told, degrees. */
const SHOWN_DEG = 30
/** Bins of the neighbours' wind speed, m/s. */
const SPEED_BIN_MS = 2
const SPEED_BINS = 10
/** Blocks of days, as the offset's own interval has them. */
const BLOCKS_H = [24, 48, 96] as const
/** From the ends of the range of wind speeds: there the neighbours' wind and the turbine's own differ in what they select. */
const EDGE_MS = 0.3

/** Power after a correction against power before, in the wind that unchanged neighbours show. */
export interface PowerAnswer {
  /** In ln of the wind speed that the power stands for: a yaw error of g takes (p / 3) ln cos(g), at any wind speed. */
  readonly step: JudgedStep
  /** Percent of energy that a step of ln wind speed is worth over the rows after. */
  pctOf(step: number): number
  readonly bySector: readonly { fromDeg: number; toDeg: number; step: number; rows: number }[]
  readonly byWindSpeed: readonly { fromMs: number; toMs: number; step: number; rows: number }[]
}

/**
 * Compares a turbine's power with that of unchanged neighbours before and after. Power is turned into the wind speed that
 * it stands for by each turbine's own measured curve, so that rows of all speeds weigh alike and no anemometer takes part
 * but in the curve. Rows are picked by the neighbours' wind alone, never by the turbine's own power; each sector and wind
 * speed has a level of its own, so that wakes and terrain cancel.
 *
 * @returns null where no neighbour, no curve or too few rows are there.
 */
export function powerAfterCorrection(farm: ProofFarm, question: ProofQuestion): PowerAnswer | null {
  const { grid, clock } = farm
  const { neighbours, target, sides } = question
  const own = grid.turbines[target]!
  const curve = curveBothWays(own.curve)
  if (!curve || neighbours.length === 0) return null
  const sector = sectorsOf(farm.direction, SECTOR_DEG)
  const wind = impliedWind(farm, [target, ...neighbours])
  const level = levelsBySector(wind, neighbours, sector)
  const lowest = own.windMinMs + EDGE_MS
  const highest = own.windMaxMs - EDGE_MS
  const seriesOf = (i: number) => {
    const value = new Float64Array(grid.length).fill(NaN)
    const cell = new Int32Array(grid.length).fill(-1)
    for (let t = 0; t < grid.length; t++) {
      if (sector[t]! < 0 || Number.isNaN(wind[i]![t]!)) continue
      const around = meanOfOthers(wind, neighbours, { i, t, s: sector[t]!, level })
      const speed = Math.exp(around)
      if (!(speed >= lowest && speed <= highest)) continue
      value[t] = wind[i]![t]! - around
      cell[t] = sector[t]! * SPEED_BINS + Math.min(SPEED_BINS - 1, Math.floor(speed / SPEED_BIN_MS))
    }
    return { value, cell }
  }
  const step = judgedStep({
    ...question,
    cells: SECTORS * SPEED_BINS,
    day: grid.day,
    clock,
    blocksH: BLOCKS_H,
    seriesOf,
  })
  if (Number.isNaN(step.step)) return null
  const mine = seriesOf(target)
  const side = sideOf(grid.length, clock, sides)
  const after: number[] = []
  for (let t = 0; t < grid.length; t++) {
    if (side[t]! > 0 && mine.cell[t]! >= 0) after.push(Math.exp(wind[target]![t]!))
  }
  const part = (wanted: (cell: number) => boolean) => {
    const cell = mine.cell.map((c) => (c >= 0 && wanted(c) ? c : -1))
    const found = stepWithinCells({ ...mine, cell, cells: SECTORS * SPEED_BINS, side, blocks: [] })
    return { step: found.step, rows: found.rowsBefore + found.rowsAfter }
  }
  return {
    step,
    pctOf: (value) => gainPct(after, curve, value),
    bySector: Array.from({ length: 360 / SHOWN_DEG }, (_, s) => ({
      fromDeg: s * SHOWN_DEG,
      toDeg: (s + 1) * SHOWN_DEG,
      ...part((c) => Math.floor((Math.floor(c / SPEED_BINS) * SECTOR_DEG) / SHOWN_DEG) === s),
    })).filter(({ rows }) => rows > 0),
    byWindSpeed: Array.from({ length: SPEED_BINS }, (_, b) => ({
      fromMs: b * SPEED_BIN_MS,
      toMs: (b + 1) * SPEED_BIN_MS,
      ...part((c) => c % SPEED_BINS === b),
    })).filter(({ rows }) => rows > 0),
  }
}

/** Percent more energy than in the same wind without the step. */
function gainPct(speedsMs: readonly number[], curve: CurveBothWays, step: number): number {
  let made = 0
  let without = 0
  for (const speed of speedsMs) {
    made += curve.power(speed)
    without += curve.power(speed * Math.exp(-step))
  }
  return 100 * (made / without - 1)
}

/** ln of the wind speed that the power stands for, of rows that run unlimited between rows that run, [i][t]. */
function impliedWind(farm: ProofFarm, turbines: readonly number[]): GridChannel {
  const curves = farm.grid.turbines.map((turbine, i) =>
    turbines.includes(i) ? curveBothWays(turbine.curve) : null,
  )
  const index = new Map(farm.grid.turbines.map((turbine, i) => [turbine, i]))
  return onGrid(farm.grid, (turbine, row) => {
    const curve = curves[index.get(turbine)!]
    return curve && runsThrough(turbine, row) ? Math.log(curve.speed(turbine.power[row]!)) : NaN
  })
}

function runsThrough(turbine: TurbineFrame, row: number): boolean {
  const before = row > 0 ? turbine.running[row - 1]! : 1
  const after = turbine.running[row + 1] ?? 1
  return turbine.running[row] === 1 && turbine.limited[row] === 0 && before === 1 && after === 1
}

/** Level of each neighbour in each sector against the median of all of them, so that it may be missing at times: [i][sector]. */
function levelsBySector(
  wind: GridChannel,
  neighbours: readonly number[],
  sector: Int32Array,
): Float64Array[] {
  const levels = wind.map(() => new Float64Array(SECTORS))
  const sum = wind.map(() => new Float64Array(SECTORS))
  const count = wind.map(() => new Float64Array(SECTORS))
  for (let t = 0; t < sector.length; t++) {
    if (sector[t]! < 0) continue
    const shown = neighbours.filter((j) => !Number.isNaN(wind[j]![t]!))
    if (shown.length < 2) continue
    const centre = medianOf(shown.map((j) => wind[j]![t]!))
    for (const j of shown) {
      sum[j]![sector[t]!]! += wind[j]![t]! - centre
      count[j]![sector[t]!]!++
    }
  }
  for (const j of neighbours) {
    for (let s = 0; s < SECTORS; s++) levels[j]![s] = count[j]![s]! > 0 ? sum[j]![s]! / count[j]![s]! : 0
  }
  return levels
}

function meanOfOthers(
  wind: GridChannel,
  neighbours: readonly number[],
  { i, t, s, level }: { i: number; t: number; s: number; level: readonly Float64Array[] },
): number {
  let sum = 0
  let count = 0
  for (const j of neighbours) {
    const value = wind[j]![t]!
    if (j === i || Number.isNaN(value)) continue
    sum += value - level[j]![s]!
    count++
  }
  return count > 0 ? sum / count : NaN
}
