import { DEG_PER_RAD, wrap180 } from '../../kernel/angle/index.ts'
import { chiSquareUpperTail, resampledSlopes, type DayWeights } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import { fitOffset, type OffsetModel } from './offset-fit.ts'
import { offsetRows, type OffsetRows } from './offset-rows.ts'
import { NORMAL_95, resampledHalfWidth } from './resampled-spread.ts'

/** Rows and days below which a group has no offset of its own. */
const FEW_ROWS = 60
const FEW_DAYS = 4
/** Chance below which an offset counts as one that depends on wind speed. */
const CURVE_CHANCE = 0.01
/** Groups alike, or a slope of 0: two questions are put to the same bins. */
const QUESTIONS = 2

export type Condition = 'wind-speed' | 'day-night' | 'turbulence' | 'wake'

/** d of the rows of one condition; degrees. Level groups are those of all rows, the noise is the group's own. */
export interface ConditionOffset {
  readonly condition: Condition
  readonly label: string
  /** m/s, of a bin of wind speed; else null. */
  readonly fromMs: number | null
  readonly toMs: number | null
  readonly rows: number
  readonly days: number
  /** NaN, both, where the group has too few rows or days, or the fit did not settle. */
  readonly offsetDeg: number
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
  readonly points: readonly { windSpeedMs: number; offsetDeg: number; halfWidthDeg: number }[]
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
  readonly model: OffsetModel
  readonly dayWeights: readonly DayWeights[]
  readonly days: number
  /** Per row of the frame: 1 = free stream, 0 = in a wake; absent: not known. */
  readonly freeStream?: Uint8Array
}

/**
 * The static offset apart by wind speed (1 m/s), day and night, tercile of turbulence, free stream and wake, each with an
 * interval, and whether the groups of a condition differ: a vane that sits in the swirl of the rotor reads off by an angle
 * that depends on wind speed, and one number for the controller is then wrong at both ends.
 *
 * @returns no groups where the vane does not vary or the fit to all rows does not settle.
 */
export function offsetByCondition(frame: TurbineFrame, request: OffsetByConditionRequest): OffsetByCondition {
  const rows = offsetRows(frame, request.days)
  if (!fitOffset(rows, request.model).converged) return { groups: [], sameness: [], slope: null, curve: null }
  const groups = groupsOf(frame, rows, request.freeStream).map((group) =>
    conditionOffset(rows, group, request),
  )
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
  /** Places in OffsetRows. */
  readonly members: readonly number[]
}

function groupsOf(frame: TurbineFrame, rows: OffsetRows, freeStream: Uint8Array | undefined): Group[] {
  const members = (belongs: (k: number) => boolean): number[] => {
    const list: number[] = []
    for (let k = 0; k < rows.cell.length; k++) if (belongs(k)) list.push(k)
    return list
  }
  // Cells of OffsetRows: band, then tercile of turbulence, then night.
  const nightOf = (k: number): number => rows.cell[k]! % 2
  const tercileOf = (k: number): number => (rows.cell[k]! >> 1) % 3
  const lowest = Math.floor(frame.windMinMs)
  const groups: Group[] = []
  for (let band = 0; band < rows.bands; band++) {
    const fromMs = lowest + band
    groups.push({
      condition: 'wind-speed',
      label: `${fromMs} to ${fromMs + 1} m/s`,
      fromMs,
      members: members((k) => rows.band[k] === band),
    })
  }
  for (const [night, label] of ['07 to 19 h', '19 to 07 h'].entries()) {
    groups.push({ condition: 'day-night', label, members: members((k) => nightOf(k) === night) })
  }
  if (frame.turbulence.some((value) => !Number.isNaN(value))) {
    for (const [tercile, label] of ['low turbulence', 'middle turbulence', 'high turbulence'].entries()) {
      groups.push({ condition: 'turbulence', label, members: members((k) => tercileOf(k) === tercile) })
    }
  }
  if (freeStream) {
    const free = freeStream.filter((_, i) => frame.reason[i] === 0)
    groups.push(
      { condition: 'wake', label: 'free stream', members: members((k) => free[k] === 1) },
      { condition: 'wake', label: 'in a wake', members: members((k) => free[k] !== 1) },
    )
  }
  return groups.filter((group) => group.members.length > 0)
}

function conditionOffset(
  rows: OffsetRows,
  group: Group,
  { model, dayWeights }: OffsetByConditionRequest,
): ConditionOffset {
  const own = membersOf(rows, group.members)
  const days = new Set(own.day).size
  const described = {
    condition: group.condition,
    label: group.label,
    fromMs: group.fromMs ?? null,
    toMs: group.fromMs === undefined ? null : group.fromMs + 1,
    rows: group.members.length,
    days,
  }
  const unknown = { ...described, offsetDeg: NaN, halfWidthDeg: NaN }
  if (group.members.length < FEW_ROWS || days < FEW_DAYS) return unknown
  const fit = fitOffset(own, model)
  if (!fit.converged) return unknown
  let half = NaN
  for (const weights of dayWeights) {
    const next = resampledHalfWidth(resampledSlopes(fit.sums, weights), weights, days)
    if (!Number.isNaN(next) && !(half >= next)) half = next
  }
  return {
    ...described,
    offsetDeg: wrap180(fit.offset * DEG_PER_RAD - rows.centreDeg),
    halfWidthDeg: half * fit.stretch * DEG_PER_RAD,
  }
}

function membersOf(rows: OffsetRows, members: readonly number[]): OffsetRows {
  const whole = (values: Int32Array): Int32Array => Int32Array.from(members, (k) => values[k]!)
  const numbers = (values: Float64Array): Float64Array => Float64Array.from(members, (k) => values[k]!)
  const day = whole(rows.day)
  return {
    ...rows,
    day,
    chain: day,
    position: whole(rows.position),
    cell: whole(rows.cell),
    band: whole(rows.band),
    vane: numbers(rows.vane),
    steepness: numbers(rows.steepness),
    logRatio: numbers(rows.logRatio),
  }
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
