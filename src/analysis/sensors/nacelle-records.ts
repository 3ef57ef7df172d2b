import { RAD_PER_DEG, wrap180, wrap360 } from '../../kernel/angle/index.ts'
import { medianOf } from '../../kernel/stats/index.ts'
import { resolutionOf } from '../../kernel/motion/index.ts'
import type { Frame, TurbineFrame } from '../../frame/index.ts'
import {
  headingSteps,
  runningDirection,
  type HeadingLevel,
  type HeadingRecord,
} from '../changes/offset-changes-heading.ts'
import { farmGrid, type FarmGrid } from '../neighbours/farm-grid.ts'
import { deviations, hoursOf } from './nacelle-deviation.ts'
import { positionJumps, type PositionJumps } from './nacelle-jumps.ts'
import { slowSlips, type SlowSlip } from './nacelle-slip.ts'
import { stuckSpells, vaneStill, type StuckSpell } from './nacelle-stuck.ts'
import { zeroLost, type ZeroLost } from './nacelle-zero.ts'

/** Rows of an hour agree by this much where N + v follows the wind; of noise by less. Resultant length. */
const LEAST_AGREEMENT = 0.85
/** Fewer hours than this say nothing of the reading. */
const FEW_HOURS = 24
/** A farm of fewer good turbines has no majority. */
const FEWEST_GOOD = 3
/** Rows of more seconds are means of many readings: the step of the reading is not seen in them. */
const SINGLE_READINGS_S = 60

/** What the farm says of one turbine's nacelle position. */
export interface NacelleRecord {
  /**
   * alone: no two others to compare with; reversed: its sign is wrong; unrelated: it has nothing to do with the wind;
   * zero-lost: another zero again and again; compared: the rest.
   */
  readonly state: 'missing' | 'alone' | 'reversed' | 'unrelated' | 'zero-lost' | 'compared'
  /** Steps that vane or position made, for the changes of the offset; null where the heading cannot tell. */
  readonly heading: HeadingRecord | null
  /** n - d against the consensus, in order of time; empty unless compared or zero-lost. */
  readonly levels: readonly HeadingLevel[]
  readonly zeroLost: ZeroLost | null
  readonly slips: readonly SlowSlip[]
  readonly stuck: readonly StuckSpell[]
  readonly jumps: PositionJumps | null
  /** Step of the reading, degrees; NaN where rows are means. */
  readonly resolutionDeg: number
}

export interface FarmNorth {
  readonly turbines: readonly NacelleRecord[]
  /** Wind direction of the farm at each interval, steps taken out, degrees, [0, 360): off the true one by one constant. */
  readonly consensusDeg: Float64Array
}

/**
 * The nacelle position of every turbine against the farm's consensus, no single north trusted: turbines whose reading is
 * reversed, unrelated to the wind or without a lasting zero are taken out first, the worst first, and then judged against the
 * rest. Rows in which the vane keeps one value are not heard.
 *
 * @param reversed  the sign of this turbine's position or vane is known to be wrong.
 */
export function nacelleRecords(frame: Frame, reversed: readonly boolean[]): FarmNorth {
  const grid = farmGrid(frame)
  if (frame.turbines.length < 3) return withoutOthers(frame, grid, reversed)
  const heard = runningDirection(grid).map((values, i) => {
    if (reversed[i]) return new Float64Array(values.length).fill(NaN)
    const still = vaneStill(frame.turbines[i]!)
    return values.map((value, t) => (still[grid.row[i]![t]!] === 1 ? NaN : value))
  })
  const original = heard.map((values) => values.slice())
  const stuck = hushStuck(frame, grid, heard)
  const state = frame.turbines.map((turbine, i): NacelleRecord['state'] => {
    if (turbine.nacellePosition.every((position) => Number.isNaN(position))) return 'missing'
    // The frame gives no direction where the position follows no nacelle.
    const told = (values: Float64Array): boolean => values.some((value) => !Number.isNaN(value))
    if (told(turbine.vane) && !told(turbine.indicatedDirection)) return 'unrelated'
    return reversed[i] ? 'reversed' : 'compared'
  })
  hushUnsteady(frame, grid, heard, state)

  const found = headingSteps(frame, grid, heard)
  const consensusDeg = levelledConsensus(frame, heard, found)
  const turbines = frame.turbines.map((turbine, i): NacelleRecord => {
    const record = found[i] ?? null
    const zero =
      state[i] === 'zero-lost'
        ? zeroLost(
            turbine,
            grid,
            grid.row[i]!,
            original[i]!.map((value, t) => wrap180(value - consensusDeg[t]!)),
            frame,
          )
        : null
    const slips = record ? slowSlips(turbine, record) : []
    return {
      state: state[i] === 'compared' && !record ? 'alone' : state[i]!,
      heading: record && withoutSlips(record, slips),
      levels: zero?.pieces ?? record?.levels ?? [],
      zeroLost: zero,
      slips,
      stuck: stuck[i]!,
      jumps: positionJumps(turbine, atRows(grid, i, consensusDeg)),
      resolutionDeg: resolutionOfReading(turbine),
    }
  })
  return { turbines, consensusDeg }
}

/** Two turbines tell of neither which one is off, one of nothing. */
function withoutOthers(frame: Frame, grid: FarmGrid, reversed: readonly boolean[]): FarmNorth {
  const consensusDeg = new Float64Array(grid.length).fill(NaN)
  const turbines = frame.turbines.map((turbine, i): NacelleRecord => {
    const logged = turbine.nacellePosition.some((position) => !Number.isNaN(position))
    return {
      state: !logged ? 'missing' : reversed[i] ? 'reversed' : 'alone',
      heading: null,
      levels: [],
      zeroLost: null,
      slips: [],
      stuck: [],
      jumps: positionJumps(turbine, atRows(grid, i, consensusDeg)),
      resolutionDeg: resolutionOfReading(turbine),
    }
  })
  return { turbines, consensusDeg }
}

/** Means of an interval show no step of the reading. */
function resolutionOfReading({ intervalS, time, nacellePosition }: TurbineFrame): number {
  if (intervalS > SINGLE_READINGS_S) return NaN
  return (
    resolutionOf(
      time.map((ms) => ms / 1000),
      nacellePosition,
    ).stepDeg || NaN
  )
}

/** Values on the farm's clock, at the rows of one turbine. */
function atRows(grid: FarmGrid, i: number, values: Float64Array): Float64Array {
  const rows = new Float64Array(grid.turbines[i]!.time.length).fill(NaN)
  grid.row[i]!.forEach((row, t) => {
    if (row >= 0) rows[row] = values[t]!
  })
  return rows
}

/** Finds spells in which the position stands still though the nacelle turns, and hushes them. */
function hushStuck(frame: Frame, grid: FarmGrid, heard: Float64Array[]): StuckSpell[][] {
  const off = deviations(grid, heard)
  return frame.turbines.map((turbine, i) => {
    const spells = stuckSpells(turbine, atRows(grid, i, off[i]!))
    for (const { fromMs, toMs } of spells) {
      const slot = (ms: number): number => Math.round((ms - frame.fromMs) / (frame.intervalS * 1000))
      heard[i]!.fill(NaN, slot(fromMs), slot(toMs))
    }
    return spells
  })
}

/** Hushes turbines whose N + v is noise or takes another zero again and again, the worst first, and says so in `state`. */
function hushUnsteady(
  frame: Frame,
  grid: FarmGrid,
  heard: Float64Array[],
  state: NacelleRecord['state'][],
): void {
  for (;;) {
    const good = state.filter((one) => one === 'compared').length
    if (good <= FEWEST_GOOD) return
    const off = deviations(grid, heard)
    let worst = -1
    let worstScore = 0
    let worstState: NacelleRecord['state'] = 'compared'
    frame.turbines.forEach((turbine, i) => {
      if (state[i] !== 'compared') return
      const hours = hoursOf(off[i]!, frame.intervalS)
      if (hours.length < FEW_HOURS) return
      const agreement = medianOf(hours.map((hour) => hour.agreement))
      const isUnrelated = frame.intervalS <= 1200 && agreement < LEAST_AGREEMENT
      const zero = isUnrelated ? null : zeroLost(turbine, grid, grid.row[i]!, off[i]!, frame)
      const score = isUnrelated ? Infinity : (zero?.jumps ?? 0) * (zero?.medianJumpDeg ?? 0)
      if (score > worstScore) {
        worst = i
        worstScore = score
        worstState = isUnrelated ? 'unrelated' : 'zero-lost'
      }
    })
    if (worst < 0) return
    state[worst] = worstState
    heard[worst] = new Float64Array(grid.length).fill(NaN)
  }
}

/** Mean direction of the turbines that are heard, each with its level of the time taken out. */
function levelledConsensus(
  frame: Frame,
  heard: readonly Float64Array[],
  records: readonly (HeadingRecord | null)[],
): Float64Array {
  const length = heard[0]?.length ?? 0
  const sin = new Float64Array(length)
  const cos = new Float64Array(length)
  records.forEach((record, i) => {
    for (const { fromMs, toMs, deg } of record?.levels ?? []) {
      const slot = (ms: number): number => Math.round((ms - frame.fromMs) / (frame.intervalS * 1000))
      for (let t = slot(fromMs); t < Math.min(length, slot(toMs)); t++) {
        const angle = (heard[i]![t]! - deg) * RAD_PER_DEG
        if (Number.isNaN(angle)) continue
        sin[t]! += Math.sin(angle)
        cos[t]! += Math.cos(angle)
      }
    }
  })
  return sin.map((s, t) => (s === 0 && cos[t] === 0 ? NaN : wrap360(Math.atan2(s, cos[t]!) / RAD_PER_DEG)))
}

/** A slow slip is no step: where there is one, the heading cannot tell whether the offset changed beside it. */
function withoutSlips(record: HeadingRecord, slips: readonly SlowSlip[]): HeadingRecord {
  if (slips.length === 0) return record
  const isSlip = (k: number): boolean =>
    slips.some(({ firstStep, lastStep }) => k >= firstStep && k <= lastStep)
  return { ...record, steps: record.steps.filter((_, k) => !isSlip(k)), whole: false }
}
