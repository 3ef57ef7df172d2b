import { YawMoveWindows, type YawMoveRows } from '../offset/yaw-move-windows.ts'
import { vaneDay, type VaneDay } from '../sensors/vane-day.ts'
import { yawDay, type YawDay } from '../yaw-activity/yaw-day.ts'
import { DAY_MS, type HighRateRows } from './high-rate-rows.ts'

/** Rows further apart than this show no yaw moves, s. */
const SLOWEST_S = 10

/**
 * What is kept of a day of high-rate rows: small and plain, so that it can travel between threads and a long log needs no
 * memory for its rows. One entry for each question that looks at the rows themselves.
 */
export interface HighRateDay {
  /** Start of the day (UTC), epoch ms. */
  readonly dayMs: number
  /** Rows of the day itself. */
  readonly rows: number
  /** Usual time between rows, s; NaN with fewer than two. */
  readonly sampleS: number
  /** The minutes around yaw moves, and around rests, that begin on this day. */
  readonly moves: YawMoveRows
  /** What the readings of the vane show of the sensor itself. */
  readonly vane: VaneDay
  /** What the yaw drive did; null where rows are too far apart or hold no position. */
  readonly yaw: YawDay | null
}

/** Everything that one turbine's high-rate rows told, day by day in order of time. */
export interface HighRateRecord {
  readonly turbine: string
  readonly days: readonly HighRateDay[]
}

/** Runs every question that looks at high-rate rows over one day; in a worker thread where there is one. */
export function examineDay(rows: HighRateRows): HighRateDay {
  return {
    dayMs: rows.dayMs,
    rows: rows.end - rows.first,
    sampleS: rows.sampleS,
    moves: movesOf(rows),
    vane: vaneDay(rows),
    yaw: yawDay(rows),
  }
}

function movesOf(rows: HighRateRows): YawMoveRows {
  const windows = new YawMoveWindows()
  if (rows.sampleS <= SLOWEST_S) {
    windows.add({
      timeMs: rows.timeMs,
      vane: rows.vane,
      power: rows.power,
      nacellePosition: rows.nacellePosition,
      day: new Int32Array(rows.timeMs.length),
      usable: rows.running.map((runs, i) => (runs === 1 && rows.limited[i] === 0 ? 1 : 0)),
    })
  }
  return windows.rowsBetween(rows.dayMs, rows.dayMs + DAY_MS)
}
