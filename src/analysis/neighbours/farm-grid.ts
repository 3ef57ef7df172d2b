import type { Frame, TurbineFrame } from '../../frame/index.ts'

/** One channel of the farm on a common clock: row of turbine i at interval t stands at [i][t]; NaN = missing. */
export type GridChannel = readonly Float64Array[]

/** The farm on a common clock: neighbours at the same time stand at the same index. */
export interface FarmGrid {
  readonly turbines: readonly TurbineFrame[]
  /** Number of intervals. */
  readonly length: number
  /** Row of turbine i at interval t, -1 where there is none: [i][t]. */
  readonly row: readonly Int32Array[]
  /** Calendar day of each interval; -1 where no turbine has a row. */
  readonly day: Int32Array
}

/** Places the rows of all turbines on one clock of the frame's interval. */
export function farmGrid(frame: Pick<Frame, 'intervalS' | 'fromMs' | 'toMs' | 'turbines'>): FarmGrid {
  const intervalMs = frame.intervalS * 1000
  const length = Math.max(1, Math.round((frame.toMs - frame.fromMs) / intervalMs))
  const day = new Int32Array(length).fill(-1)
  const row = frame.turbines.map((turbine) => {
    const places = new Int32Array(length).fill(-1)
    for (let i = 0; i < turbine.time.length; i++) {
      const t = Math.round((turbine.time[i]! - frame.fromMs) / intervalMs)
      if (t < 0 || t >= length) continue
      places[t] = i
      day[t] = turbine.day[i]!
    }
    return places
  })
  return { turbines: frame.turbines, length, row, day }
}

/** A channel on the grid. */
export function onGrid(grid: FarmGrid, valueOf: (turbine: TurbineFrame, row: number) => number): GridChannel {
  return grid.turbines.map((turbine, i) => {
    const values = new Float64Array(grid.length).fill(NaN)
    const rows = grid.row[i]!
    for (let t = 0; t < grid.length; t++) if (rows[t]! >= 0) values[t] = valueOf(turbine, rows[t]!)
    return values
  })
}
