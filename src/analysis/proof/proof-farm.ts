import { onGrid, farmGrid, type FarmGrid, type GridChannel } from '../neighbours/farm-grid.ts'
import { farmDirection, type FarmDirection } from '../neighbours/farm-direction.ts'
import type { FarmRows } from '../neighbours/neighbours.ts'
import type { Sides } from './judged-step.ts'

/** Sectors of the wind's direction in which turbines have levels of their own against each other, degrees. */
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
  /** Sector of the consensus direction; -1: not known. Sector 0 throughout where no direction is known at all. */
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
  const sectors = 360 / SECTOR_DEG
  const isKnown = direction.consensusDeg.some((angle) => !Number.isNaN(angle))
  return {
    grid,
    clock: { fromMs: farm.fromMs, intervalMs: farm.intervalS * 1000 },
    direction,
    indicatedDeg,
    positionDeg,
    positionUsable: positionDeg.map(
      (values, i) => !blocked[i] && values.some((value) => !Number.isNaN(value)),
    ),
    sector: Int32Array.from(direction.consensusDeg, (angle) =>
      Number.isNaN(angle) ? (isKnown ? -1 : 0) : Math.floor(angle / SECTOR_DEG) % sectors,
    ),
    sectors,
  }
}
