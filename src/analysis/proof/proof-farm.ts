import { onGrid, farmGrid, type FarmGrid, type GridChannel } from '../neighbours/farm-grid.ts'
import { farmDirection, type FarmDirection } from '../neighbours/farm-direction.ts'
import type { FarmRows } from '../neighbours/neighbours.ts'
import type { Sides } from './judged-step.ts'

/** Sectors of the wind's direction in which headings have levels of their own against each other, degrees. */
export const SECTOR_DEG = 30

/** The farm as corrections are judged by. */
export interface ProofFarm {
  readonly grid: FarmGrid
  readonly clock: { readonly fromMs: number; readonly intervalMs: number }
  readonly direction: FarmDirection
  /** N + v of running rows, [i][t]. */
  readonly indicatedDeg: GridChannel
  /** N of running rows, [i][t]. */
  readonly positionDeg: GridChannel
  /** Whether the turbine has nacelle positions whose sign nothing speaks against. */
  readonly positionUsable: readonly boolean[]
  /** Sector of the consensus direction, see `sectorsOf`. */
  readonly sector: Int32Array
  readonly sectors: number
}

/** One correction, and what it may be compared with. */
export interface ProofQuestion {
  readonly target: number
  readonly atMs: number
  readonly enteredDeg: number
  readonly neighbours: readonly number[]
  readonly sides: Sides
}

/** @param blocked  turbines whose vane or position sensor forbids to take their headings for directions. */
export function proofFarm(farm: FarmRows, blocked: readonly boolean[]): ProofFarm {
  const grid = farmGrid(farm)
  const direction = farmDirection(grid)
  const indicatedDeg = onGrid(grid, (turbine, row) =>
    turbine.running[row] === 1 ? turbine.indicatedDirection[row]! : NaN,
  )
  const positionDeg = onGrid(grid, (turbine, row) =>
    turbine.running[row] === 1 ? turbine.nacellePosition[row]! : NaN,
  )
  return {
    grid,
    clock: { fromMs: farm.fromMs, intervalMs: farm.intervalS * 1000 },
    direction,
    indicatedDeg,
    positionDeg,
    positionUsable: positionDeg.map(
      (values, i) => !blocked[i] && values.some((value) => !Number.isNaN(value)),
    ),
    sector: sectorsOf(direction, SECTOR_DEG),
    sectors: 360 / SECTOR_DEG,
  }
}

/** Sector of the consensus direction at each interval; -1: not known; 0 throughout where none is known at all. */
export function sectorsOf({ consensusDeg }: FarmDirection, widthDeg: number): Int32Array {
  const isKnown = consensusDeg.some((angle) => !Number.isNaN(angle))
  return Int32Array.from(consensusDeg, (angle) =>
    Number.isNaN(angle) ? (isKnown ? -1 : 0) : Math.floor(angle / widthDeg) % Math.round(360 / widthDeg),
  )
}
