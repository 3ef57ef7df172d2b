import { wrap180 } from '../../kernel/angle/index.ts'
import { powerAt } from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'

const SPEED_WIDTH_MS = 1
const VANE_WIDTH_DEG = 2

/**
 * Numbers by wind speed and vane, on one grid. Entry of speed bin s and vane bin v at [s * vaneBins + v]; speed bin s is
 * [speedFromMs + s, + 1) m/s, vane bin v [vaneFromDeg + 2 v, + 2) degrees; a vane bin is centred on 0.
 */
export interface VaneGrid {
  readonly speedFromMs: number
  readonly speedWidthMs: number
  readonly speedBins: number
  readonly vaneFromDeg: number
  readonly vaneWidthDeg: number
  readonly vaneBins: number
  readonly rows: number[]
}

/** Power over the measured curve, of the rows used for the static offset. */
export interface PowerAgainstVane extends VaneGrid {
  /** NaN in an empty entry. */
  readonly relativePowerMean: number[]
  /** Of the rows, divisor n - 1; NaN with fewer than two. */
  readonly relativePowerSd: number[]
}

/** Power by vane for each wind speed, rows used for the static offset: what a reader can check the estimate against. */
export function powerAgainstVane(frame: TurbineFrame): PowerAgainstVane {
  const used: number[] = []
  for (let i = 0; i < frame.time.length; i++) if (frame.reason[i] === 0) used.push(i)
  const { grid, entryOf } = gridOf(used, frame.normalisedSpeed, frame.vane)
  const size = grid.speedBins * grid.vaneBins
  const rows = new Array<number>(size).fill(0)
  const mean = new Float64Array(size)
  const squares = new Float64Array(size)
  for (const i of used) {
    const entry = entryOf(i)
    const ratio = frame.power[i]! / powerAt(frame.curve, frame.normalisedSpeed[i]!)
    rows[entry]!++
    const delta = ratio - mean[entry]!
    mean[entry]! += delta / rows[entry]!
    squares[entry]! += delta * (ratio - mean[entry]!)
  }
  return {
    ...grid,
    rows,
    relativePowerMean: rows.map((count, entry) => (count > 0 ? mean[entry]! : NaN)),
    relativePowerSd: rows.map((count, entry) => (count > 1 ? Math.sqrt(squares[entry]! / (count - 1)) : NaN)),
  }
}

/** Capture matrix: how many running rows of the log lie in each entry, wind speed as read, vane never cut. */
export function captureMatrix(frame: TurbineFrame): VaneGrid {
  const running: number[] = []
  for (let i = 0; i < frame.time.length; i++) if (frame.running[i] === 1) running.push(i)
  const { grid, entryOf } = gridOf(running, frame.windSpeed, frame.vane)
  const rows = new Array<number>(grid.speedBins * grid.vaneBins).fill(0)
  for (const i of running) {
    const entry = entryOf(i)
    if (entry >= 0) rows[entry]!++
  }
  return { ...grid, rows }
}

/** The smallest grid that holds all rows; rows without speed or vane have entry -1. */
function gridOf(
  rows: readonly number[],
  speed: Float64Array,
  vane: Float64Array,
): { grid: Omit<VaneGrid, 'rows'>; entryOf: (row: number) => number } {
  const speedBinOf = (i: number): number => Math.floor(speed[i]! / SPEED_WIDTH_MS)
  const vaneBinOf = (i: number): number => Math.floor(wrap180(vane[i]!) / VANE_WIDTH_DEG + 0.5)
  let [speedFrom, speedTo, vaneFrom, vaneTo] = [Infinity, -Infinity, Infinity, -Infinity]
  for (const i of rows) {
    const s = speedBinOf(i)
    const v = vaneBinOf(i)
    if (Number.isNaN(s + v)) continue
    speedFrom = Math.min(speedFrom, s)
    speedTo = Math.max(speedTo, s + 1)
    vaneFrom = Math.min(vaneFrom, v)
    vaneTo = Math.max(vaneTo, v + 1)
  }
  if (!(speedTo > speedFrom)) [speedFrom, speedTo, vaneFrom, vaneTo] = [0, 0, 0, 0]
  const vaneBins = vaneTo - vaneFrom
  return {
    grid: {
      speedFromMs: speedFrom * SPEED_WIDTH_MS,
      speedWidthMs: SPEED_WIDTH_MS,
      speedBins: speedTo - speedFrom,
      vaneFromDeg: (vaneFrom - 0.5) * VANE_WIDTH_DEG,
      vaneWidthDeg: VANE_WIDTH_DEG,
      vaneBins,
    },
    entryOf: (i) => {
      const entry = (speedBinOf(i) - speedFrom) * vaneBins + vaneBinOf(i) - vaneFrom
      return Number.isNaN(entry) ? -1 : entry
    },
  }
}
