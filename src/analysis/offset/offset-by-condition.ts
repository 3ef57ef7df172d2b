import { circularMean, DEG_PER_RAD, wrap180 } from '../../kernel/angle/index.ts'
import {
  chiSquareUpperTail,
  dayCells,
  dayCellSums,
  groupSlopes,
  type DayCellSums,
  type DayWeights,
} from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { OffsetFit } from './offset-fit.ts'
import type { OffsetRows } from './offset-rows.ts'
import { fewResamples, NORMAL_95, resampledHalfWidth } from './resampled-spread.ts'

/** Rows and days below which a group has no offset of its own. */
const FEW_ROWS = 60
const FEW_DAYS = 4
/** Chance below which an offset counts as one that depends on wind speed. */
const CURVE_CHANCE = 0.01
/** Groups alike, or a slope of 0: two questions are put to the same bins. */
const QUESTIONS = 2

export type Condition = 'wind-speed' | 'day-night' | 'turbulence' | 'wake'

/** d and m of the rows of one condition; degrees. Level groups, weights and noise are those of the fit to all rows. */
export interface ConditionOffset {
  readonly condition: Condition
  readonly label: string
  /** m/s, of a bin of wind speed; else null. */
  readonly fromMs: number | null
  readonly toMs: number | null
  readonly rows: number
  readonly days: number
  /** NaN, all, where the group has too few rows or days. */
  readonly offsetDeg: number
  /** m: d and the mean vane of these rows. */
  readonly standingDeg: number
  /** At 95 %, from the scatter between days: what all groups share (response, exponent) is not in it. */
  readonly halfWidthDeg: number
}

/** Whether the groups of a condition have one offset. */
export interface Sameness {
  readonly condition: Condition
  readonly groups: number
  readonly chiSquare: number
  readonly degreesOfFreedom: number
  /** Chance of differences this large among groups with one offset; NaN with fewer than two groups. */
  readonly pValue: number
}

/** An offset that depends on wind speed, for the controller's table. */
export interface OffsetCurve {
  readonly slopeDegPerMs: number
  readonly slopeInterval95: readonly [number, number]
  /** The smaller of the chances of "all alike" and of "no slope", times two. */
  readonly pValue: number
  readonly points: readonly {
    windSpeedMs: number
    offsetDeg: number
    standingDeg: number
    halfWidthDeg: number
  }[]
}

export interface OffsetByCondition {
  readonly groups: readonly ConditionOffset[]
  readonly sameness: readonly Sameness[]
  /** Slope of d over wind speed whether or not it counts; null with fewer than three bins. */
  readonly slope: Omit<OffsetCurve, 'points'> | null
  /** null: one offset for all wind speeds will do. */
  readonly curve: OffsetCurve | null
}

export interface OffsetByConditionRequest {
  /** The used rows of the frame and the fit to all of them. */
  readonly rows: OffsetRows
  readonly fit: OffsetFit
  readonly dayWeights: readonly DayWeights[]
  /** Per row of the frame: 1 = free stream, 0 = in or beside a wake; absent: not known. */
  readonly freeStream?: Uint8Array | undefined
}

/**
 * The static offset apart by wind speed (1 m/s), day and night, tercile of turbulence, free stream and wake, each with an
 * interval, and whether the groups of a condition differ: a vane that sits in the swirl of the rotor reads off by an angle
 * that depends on wind speed, and one number for the controller is then wrong at both ends.
 *
 * A group's offset is one more step of the fit to all rows, over the group's cells alone: its rows are weighted and
 * filtered as in that fit.
 *
 * @returns no groups where the fit did not settle.
 */
export function offsetByCondition(frame: TurbineFrame, request: OffsetByConditionRequest): OffsetByCondition {
  const { rows, fit, dayWeights } = request
  if (!fit.converged) return { groups: [], sameness: [], slope: null, curve: null }
  const fewer = fewResamples(dayWeights)
  const groups = [
    ...offsetsOf(fit.sums, byCell(frame, rows), { rows, fit, dayWeights: fewer }),
    ...byWake(frame, request, fewer),
  ]
  const sameness = [...new Set(groups.map((group) => group.condition))].map((condition) =>
    samenessOf(
      condition,
      groups.filter((group) => group.condition === condition),
    ),
  )
  const bySpeed = groups.filter(
    (group) => group.condition === 'wind-speed' && !Number.isNaN(group.halfWidthDeg),
  )
  const alike = sameness.find((test) => test.condition === 'wind-speed')?.pValue ?? NaN
  const slope = slopeOver(bySpeed, alike)
  return {
    groups,
    sameness,
    slope,
    curve:
      slope && slope.pValue < CURVE_CHANCE
        ? {
            ...slope,
            points: bySpeed.map((group) => ({
              windSpeedMs: (group.fromMs! + group.toMs!) / 2,
              offsetDeg: group.offsetDeg,
              standingDeg: group.standingDeg,
              halfWidthDeg: group.halfWidthDeg,
            })),
          }
        : null,
  }
}

interface Group {
  readonly condition: Condition
  readonly label: string
  readonly fromMs?: number
  /** Whether a cell of the sums is in it. */
  readonly holds: (cell: number) => boolean
}

/** Conditions that the cells of OffsetRows tell: band of wind speed, then tercile of turbulence, then night. */
function byCell(frame: TurbineFrame, rows: OffsetRows): Group[] {
  const lowest = Math.floor(frame.windMinMs)
  const groups: Group[] = []
  for (let band = 0; band < rows.bands; band++) {
    const fromMs = lowest + band
    groups.push({
      condition: 'wind-speed',
      label: `${fromMs} to ${fromMs + 1} m/s`,
      fromMs,
      holds: (cell) => Math.floor(cell / 6) === band,
    })
  }
  for (const [night, label] of ['07 to 19 h', '19 to 07 h'].entries()) {
    groups.push({ condition: 'day-night', label, holds: (cell) => cell % 2 === night })
  }
  if (frame.turbulence.some((value) => !Number.isNaN(value))) {
    for (const [tercile, label] of ['low turbulence', 'middle turbulence', 'high turbulence'].entries()) {
      groups.push({ condition: 'turbulence', label, holds: (cell) => (cell >> 1) % 3 === tercile })
    }
  }
  return groups
}

/** Free stream or not is no part of the cells: the sums are made anew, with a level of its own for either. */
function byWake(
  frame: TurbineFrame,
  { rows, fit, freeStream }: OffsetByConditionRequest,
  dayWeights: readonly DayWeights[],
): ConditionOffset[] {
  if (!freeStream) return []
  const free = freeStream.filter((_, i) => frame.reason[i] === 0)
  const cell = rows.cell.map((own, k) => 2 * own + (free[k] === 1 ? 1 : 0))
  const layout = dayCells(rows.day, cell, { days: rows.days, cells: 2 * rows.cells })
  const groups: Group[] = [
    { condition: 'wake', label: 'free stream', holds: (own) => own % 2 === 1 },
    { condition: 'wake', label: 'in or beside a wake', holds: (own) => own % 2 === 0 },
  ]
  const sums = dayCellSums(layout, fit.whiteX, fit.whiteY, fit.weight)
  return offsetsOf(sums, groups, { rows: { ...rows, cell, cells: layout.cells }, fit, dayWeights })
}

function offsetsOf(
  sums: DayCellSums,
  groups: readonly Group[],
  { rows, fit, dayWeights }: { rows: OffsetRows; fit: OffsetFit; dayWeights: readonly DayWeights[] },
): ConditionOffset[] {
  const cellsOf = groups.map(({ holds }) => [...Array(rows.cells).keys()].filter(holds))
  const slopes = dayWeights.map((weights) => groupSlopes(sums, cellsOf, weights))
  return groups.flatMap((group, g) => {
    const vanes: number[] = []
    const seen = new Set<number>()
    for (let k = 0; k < rows.cell.length; k++) {
      if (!group.holds(rows.cell[k]!)) continue
      vanes.push(rows.vane[k]! * DEG_PER_RAD)
      seen.add(rows.day[k]!)
    }
    if (vanes.length === 0) return []
    const days = seen.size
    let half = NaN
    dayWeights.forEach((weights, w) => {
      const next = resampledHalfWidth(slopes[w]![g]!.resampled, weights, days)
      if (!Number.isNaN(next) && !(half >= next)) half = next
    })
    const few = vanes.length < FEW_ROWS || days < FEW_DAYS
    const step = few ? NaN : (slopes[0]?.[g]!.slope ?? NaN)
    const offsetDeg = wrap180((fit.offset + step) * DEG_PER_RAD - rows.centreDeg)
    return {
      condition: group.condition,
      label: group.label,
      fromMs: group.fromMs ?? null,
      toMs: group.fromMs === undefined ? null : group.fromMs + 1,
      rows: vanes.length,
      days,
      offsetDeg,
      standingDeg: wrap180(offsetDeg + rows.centreDeg + circularMean(vanes).direction),
      halfWidthDeg: few ? NaN : half * fit.stretch * DEG_PER_RAD,
    }
  })
}

/** Cochran's Q: squared distances from the weighted mean in units of their standard errors. */
function samenessOf(condition: Condition, groups: readonly ConditionOffset[]): Sameness {
  const known = groups.filter((group) => group.halfWidthDeg > 0)
  const nothing = { condition, groups: known.length, chiSquare: NaN, degreesOfFreedom: 0, pValue: NaN }
  if (known.length < 2) return nothing
  const [first] = known
  let weights = 0
  let sum = 0
  for (const group of known) {
    const weight = (NORMAL_95 / group.halfWidthDeg) ** 2
    weights += weight
    sum += weight * wrap180(group.offsetDeg - first!.offsetDeg)
  }
  let chiSquare = 0
  for (const group of known) {
    const off = wrap180(group.offsetDeg - first!.offsetDeg - sum / weights)
    chiSquare += (NORMAL_95 / group.halfWidthDeg) ** 2 * off * off
  }
  const degreesOfFreedom = known.length - 1
  return { ...nothing, chiSquare, degreesOfFreedom, pValue: chiSquareUpperTail(chiSquare, degreesOfFreedom) }
}

/** Weighted straight line through the offsets of the bins. */
function slopeOver(bins: readonly ConditionOffset[], alike: number): OffsetByCondition['slope'] {
  const known = bins.filter((bin) => bin.halfWidthDeg > 0)
  if (known.length < 3) return null
  const origin = known[0]!.offsetDeg
  let [w, wx, wy, wxx, wxy] = [0, 0, 0, 0, 0]
  for (const bin of known) {
    const weight = (NORMAL_95 / bin.halfWidthDeg) ** 2
    const x = (bin.fromMs! + bin.toMs!) / 2
    const y = wrap180(bin.offsetDeg - origin)
    w += weight
    wx += weight * x
    wy += weight * y
    wxx += weight * x * x
    wxy += weight * x * y
  }
  const spread = wxx - (wx * wx) / w
  const slope = (wxy - (wx * wy) / w) / spread
  const half = NORMAL_95 / Math.sqrt(spread)
  const noSlope = chiSquareUpperTail(slope * slope * spread, 1)
  return {
    slopeDegPerMs: slope,
    slopeInterval95: [slope - half, slope + half],
    pValue: Math.min(1, QUESTIONS * Math.min(noSlope, Number.isNaN(alike) ? 1 : alike)),
  }
}
