import {
  circularMean,
  circularMedian,
  circularSd,
  DEG_PER_RAD,
  RAD_PER_DEG,
  wrap180,
} from '../../kernel/angle/index.ts'
import type { DayWeights } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { TurbineSetup } from '../../sheet/index.ts'
import { NORMAL_95, resampledHalfWidth } from './resampled-spread.ts'
import { runningBelowRated } from '../vane-statistics.ts'

/** Standard deviation of how well the zero of a reference is known, degrees; it does not shrink with days. */
export const REFERENCE_MOUNTING_DEG = 0.5
/** Fewer rows with a reference say nothing. */
const FEW_ROWS = 36
/** A direction that stays this near to 0 while the turbine runs is one relative to the nacelle, degrees. */
const RELATIVE_CENTRE_DEG = 40
const RELATIVE_SPREAD_DEG = 40
/** A reference this far off the usual difference did not see the rotor's wind, degrees. */
const STRAY_DEG = 45
const BIN_MS = 1

type ReferenceKind = NonNullable<TurbineSetup['reference']>['kind']

/** d by a reference; angles in degrees, half-widths at 95 %. */
export interface ReferenceOffset {
  readonly kind: ReferenceKind
  /** How the kind is known, in words. */
  readonly kindText: string
  /** d, and m: the mean yaw error that the reference saw over the same rows; NaN with `failure`. */
  readonly offsetDeg: number
  readonly standingDeg: number
  readonly halfWidthDeg: number
  readonly standingHalfWidthDeg: number
  /** Parts of the half-width of d: scatter between days, and the reference's own zero. */
  readonly statistical: number
  readonly standingStatistical: number
  readonly instrument: number
  readonly rows: number
  /** Rows that were left out because the reference stood far off the usual difference. */
  readonly strayRows: number
  readonly days: number
  /** By wind speed as read, whole m/s; half-widths from the scatter between days alone, NaN on fewer than two days. */
  readonly byWindSpeed: readonly {
    readonly fromMs: number
    readonly toMs: number
    readonly rows: number
    readonly days: number
    readonly offsetDeg: number
    readonly standingDeg: number
    readonly halfWidthDeg: number
  }[]
  readonly method: string
  readonly leansOn: string
  readonly failure: { readonly code: string; readonly text: string } | null
}

/**
 * The vane's offset from a reference instrument: d = circular mean of (yaw error by the reference - vane) over the running
 * rows below rated. A reference on the nacelle (lidar, spinner anemometer) gives the yaw error itself, one on a mast gives it only
 * against a nacelle whose north was surveyed. Exponent, power and anemometer have no say.
 *
 * @param dayWeights  of the farm's calendar.
 * @returns null where the log holds no reference.
 */
export function referenceOffset(
  frame: TurbineFrame,
  dayWeights: readonly DayWeights[],
): ReferenceOffset | null {
  const running = runningBelowRated(frame)
  const stated = frame.setup.reference?.kind
  const hasYawError = running.some((i) => !Number.isNaN(frame.referenceYawError[i]!))
  const hasDirection = running.some((i) => !Number.isNaN(frame.referenceDirection[i]!))
  if (!hasYawError && !hasDirection) return null
  const { kind, kindText } = kindOf(frame, running, stated, hasYawError)

  const refused = refusal(frame, kind, stated, hasYawError)
  if (refused) return unanswered(kind, kindText, refused, 0)
  const yawErrorAt = (i: number): number =>
    kind === 'yawError'
      ? frame.referenceYawError[i]!
      : wrap180(frame.referenceDirection[i]! - (kind === 'absoluteDirection' ? frame.nacellePosition[i]! : 0))
  const known = running.filter((i) => !Number.isNaN(yawErrorAt(i) + frame.vane[i]!))
  const usual = circularMedian(known.map((i) => wrap180(yawErrorAt(i) - frame.vane[i]!)))
  const rows = known.filter((i) => Math.abs(wrap180(yawErrorAt(i) - frame.vane[i]! - usual)) <= STRAY_DEG)
  const days = new Set(rows.map((i) => frame.day[i]!)).size
  if (rows.length < FEW_ROWS || days < 2) {
    const text = `the reference and the vane are both there in ${rows.length} running rows on ${days} days, at least ${FEW_ROWS} rows on 2 days are needed`
    return unanswered(kind, kindText, { code: 'reference-too-few-rows', text }, rows.length)
  }

  const difference = meanByDay(frame, rows, dayWeights, (i) => yawErrorAt(i) - frame.vane[i]!)
  const standing = meanByDay(frame, rows, dayWeights, yawErrorAt)
  const instrument = NORMAL_95 * (frame.setup.reference?.mountingDeg ?? REFERENCE_MOUNTING_DEG)
  return {
    kind,
    kindText,
    offsetDeg: difference.meanDeg,
    standingDeg: standing.meanDeg,
    halfWidthDeg: Math.hypot(difference.halfWidthDeg, instrument),
    standingHalfWidthDeg: Math.hypot(standing.halfWidthDeg, instrument),
    statistical: difference.halfWidthDeg,
    standingStatistical: standing.halfWidthDeg,
    instrument,
    rows: rows.length,
    strayRows: known.length - rows.length,
    days,
    byWindSpeed: bySpeed(frame, rows, dayWeights, yawErrorAt),
    ...methodOf(kind),
    failure: null,
  }
}

function kindOf(
  frame: TurbineFrame,
  running: readonly number[],
  stated: ReferenceKind | undefined,
  hasYawError: boolean,
): { kind: ReferenceKind; kindText: string } {
  if (stated) return { kind: stated, kindText: 'as the site file states' }
  if (hasYawError) return { kind: 'yawError', kindText: 'the log holds reference_yaw_error' }
  const directions = running
    .map((i) => frame.referenceDirection[i]!)
    .filter((direction) => !Number.isNaN(direction))
  const centre = wrap180(circularMean(directions).direction)
  const spread = circularSd(directions)
  const seen = `reference_direction spreads by ${spread.toFixed(0)} degrees while the turbine runs`
  return Math.abs(centre) < RELATIVE_CENTRE_DEG && spread < RELATIVE_SPREAD_DEG
    ? {
        kind: 'relativeDirection',
        kindText: `${seen}, about ${centre.toFixed(0)}: taken as relative to the nacelle`,
      }
    : { kind: 'absoluteDirection', kindText: `${seen}: taken as from north` }
}

function refusal(
  frame: TurbineFrame,
  kind: ReferenceKind,
  stated: ReferenceKind | undefined,
  hasYawError: boolean,
): ReferenceOffset['failure'] {
  if (stated && (stated === 'yawError') !== hasYawError) {
    const [wanted, there] = hasYawError
      ? ['reference_direction', 'reference_yaw_error']
      : ['reference_yaw_error', 'reference_direction']
    // A log with both channels has what the site file asks for.
    const channel = hasYawError ? frame.referenceDirection : frame.referenceYawError
    if (channel.every((value) => Number.isNaN(value))) {
      return {
        code: 'reference-missing',
        text: `the site file states a reference of kind ${stated}, but the log holds ${there} and no ${wanted}`,
      }
    }
  }
  if (kind !== 'absoluteDirection') return null
  if (frame.nacellePosition.every((value) => Number.isNaN(value))) {
    return {
      code: 'reference-without-nacelle',
      text: 'a reference direction from north tells the yaw error only together with the nacelle position, which is not in the log',
    }
  }
  if (frame.setup.nacelle?.northOffsetSource !== 'surveyed') {
    return {
      code: 'reference-north-unknown',
      text:
        "a reference direction from north tells the vane's offset only where the nacelle's own north was surveyed: " +
        'otherwise it gives north offset minus vane offset together; survey it and state nacelle.northOffsetSource',
    }
  }
  return null
}

function methodOf(kind: ReferenceKind): { method: string; leansOn: string } {
  return kind === 'absoluteDirection'
    ? {
        method: 'reference direction against nacelle position and vane',
        leansOn:
          "north of the reference and the surveyed north of the nacelle; the wind's direction is the same at both",
      }
    : {
        method: 'reference yaw error against vane',
        leansOn: 'the zero of the reference on the nacelle; neither power, anemometer nor exponent',
      }
}

function unanswered(
  kind: ReferenceKind,
  kindText: string,
  failure: NonNullable<ReferenceOffset['failure']>,
  rows: number,
): ReferenceOffset {
  return {
    kind,
    kindText,
    offsetDeg: NaN,
    standingDeg: NaN,
    halfWidthDeg: NaN,
    standingHalfWidthDeg: NaN,
    statistical: NaN,
    standingStatistical: NaN,
    instrument: NaN,
    rows,
    strayRows: 0,
    days: 0,
    byWindSpeed: [],
    ...methodOf(kind),
    failure,
  }
}

/** Circular mean of an angle, degrees, and its half-width from whole days drawn in blocks, the widest length. */
function meanByDay(
  frame: TurbineFrame,
  rows: readonly number[],
  dayWeights: readonly DayWeights[],
  angleAt: (row: number) => number,
): { meanDeg: number; halfWidthDeg: number } {
  const days = dayWeights[0]?.days ?? 0
  const sin = new Float64Array(days)
  const cos = new Float64Array(days)
  const used = new Set<number>()
  let allSin = 0
  let allCos = 0
  for (const i of rows) {
    const day = frame.day[i]!
    const angle = angleAt(i) * RAD_PER_DEG
    sin[day]! += Math.sin(angle)
    cos[day]! += Math.cos(angle)
    allSin += Math.sin(angle)
    allCos += Math.cos(angle)
    used.add(day)
  }
  const meanDeg = wrap180(Math.atan2(allSin, allCos) * DEG_PER_RAD)
  let widest = NaN
  for (const weights of dayWeights) {
    const deviations = new Float64Array(weights.resamples)
    for (let r = 0; r < weights.resamples; r++) {
      let sumSin = 0
      let sumCos = 0
      for (const day of used) {
        const times = weights.counts[r * days + day]!
        sumSin += times * sin[day]!
        sumCos += times * cos[day]!
      }
      const drawn = sumSin !== 0 || sumCos !== 0
      deviations[r] = drawn ? wrap180(Math.atan2(sumSin, sumCos) * DEG_PER_RAD - meanDeg) : NaN
    }
    const half = resampledHalfWidth(deviations, weights, used.size)
    if (!Number.isNaN(half) && !(widest >= half)) widest = half
  }
  return { meanDeg, halfWidthDeg: widest }
}

function bySpeed(
  frame: TurbineFrame,
  rows: readonly number[],
  dayWeights: readonly DayWeights[],
  yawErrorAt: (row: number) => number,
): ReferenceOffset['byWindSpeed'] {
  const bins = new Map<number, number[]>()
  for (const i of rows) {
    const bin = Math.floor(frame.windSpeed[i]! / BIN_MS)
    if (Number.isNaN(bin)) continue
    const list = bins.get(bin)
    if (list) list.push(i)
    else bins.set(bin, [i])
  }
  return [...bins]
    .sort(([a], [b]) => a - b)
    .map(([bin, list]) => {
      const { meanDeg, halfWidthDeg } = meanByDay(
        frame,
        list,
        dayWeights,
        (i) => yawErrorAt(i) - frame.vane[i]!,
      )
      return {
        fromMs: bin * BIN_MS,
        toMs: (bin + 1) * BIN_MS,
        rows: list.length,
        days: new Set(list.map((i) => frame.day[i]!)).size,
        offsetDeg: meanDeg,
        standingDeg: wrap180(circularMean(list.map(yawErrorAt)).direction),
        halfWidthDeg,
      }
    })
}
