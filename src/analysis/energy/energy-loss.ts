import { circularMean, RAD_PER_DEG, wrap180 } from '../../kernel/angle/index.ts'
import { powerAt } from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'
import { runningBelowRated } from '../vane-statistics.ts'

/** Mean length of a Gregorian year, h. */
const YEAR_H = 8765.82
const KWH_PER_MWH = 1000
/** The cosine law says nothing about a rotor further off the wind, degrees. */
const MAX_YAW_ERROR_DEG = 60

export interface EnergyLossRequest {
  readonly exponent: number
  /** d and m at the exponent in force; null = not known. */
  readonly offset: {
    readonly offsetDeg: number
    readonly standingDeg: number
    readonly standingInterval95Deg: readonly [number, number]
    /** Exponents that the ends of the interval go with: a wide end goes with a small one. Absent: the exponent in force. */
    readonly endExponents?: readonly [number, number]
  } | null
  readonly byExponent: readonly { exponent: number; offsetDeg: number; standingDeg: number }[]
}

/**
 * What the yaw error costs, from the measured curve, which already contains the offset.
 *
 * Static: a row at wind speed u with yaw error g = v + d would, after m is corrected, stand at g - m. Its gain is
 * P(u [cos(g - m) / cos(g)]^(p/3)) - P(u), capped at rated. With a vane that averages 0 this is the design's
 * [cos(v) / cos(v + d)]; with one that does not, the mean vane stays out of the gain. Dynamic: what the same rows would
 * gain on top of that if the rotor faced the wind in every interval. Over all producing rows that are not limited.
 *
 * The year is the window scaled by the hours of a year over the hours with rows; wind beyond the window is not known.
 */
export function energyLoss(frame: TurbineFrame, request: EnergyLossRequest): TurbineSheet['energyLoss'] {
  const hoursPerRow = frame.intervalS / 3600
  const rows = producingRows(frame)
  const n = frame.time.length
  const hours = n * hoursPerRow
  const windowHours = n > 0 ? (frame.time[n - 1]! - frame.time[0]!) / 3.6e6 + hoursPerRow : 0
  const scaledBy = hours > 0 ? YEAR_H / hours : NaN
  const producedMwh = (sumOver(runningRows(frame), (i) => frame.power[i]!) * hoursPerRow) / KWH_PER_MWH
  const common = {
    exponent: request.exponent,
    producedMwh,
    hours,
    windowHours,
    scaledBy,
    rows: rows.length,
  }
  const { offset } = request
  if (!offset) {
    return {
      ...common,
      static: {
        windowMwh: null,
        windowInterval95Mwh: [null, null],
        recoverablePctOfProduced: null,
        annualMwh: null,
        annualInterval95Mwh: [null, null],
      },
      dynamic: { windowMwh: null, annualMwh: null },
      band: [],
      note: 'no loss without an offset',
    }
  }
  const meanVaneDeg = wrap180(circularMean(runningBelowRated(frame).map((i) => frame.vane[i]!)).direction)
  const basePower = Float64Array.from(rows, (i) => powerAt(frame.curve, frame.normalisedSpeed[i]!))
  /** Static loss of the window if the rotor stands off by `standingDeg`, MWh. */
  const staticMwh = (standingDeg: number, exponent: number): number =>
    gainMwh(frame, { rows, basePower }, hoursPerRow, exponent, (vane) => {
      const error = vane - meanVaneDeg + standingDeg
      return [error, error - standingDeg]
    })
  const windowMwh = staticMwh(offset.standingDeg, request.exponent)
  const [low, high] = offset.standingInterval95Deg
  const [lowExponent, highExponent] = offset.endExponents ?? [request.exponent, request.exponent]
  const ends = [staticMwh(low, lowExponent), staticMwh(high, highExponent)]
  const spansZero = low <= 0 && high >= 0
  const interval = [spansZero ? 0 : Math.max(0, Math.min(...ends)), Math.max(...ends)] as const
  const dynamicMwh =
    gainMwh(frame, { rows, basePower }, hoursPerRow, request.exponent, (vane) => [
      vane - meanVaneDeg + offset.standingDeg,
      0,
    ]) - windowMwh
  return {
    ...common,
    static: {
      windowMwh,
      windowInterval95Mwh: [...interval],
      recoverablePctOfProduced: producedMwh > 0 ? (100 * windowMwh) / producedMwh : NaN,
      annualMwh: windowMwh * scaledBy,
      annualInterval95Mwh: [interval[0] * scaledBy, interval[1] * scaledBy],
    },
    dynamic: { windowMwh: dynamicMwh, annualMwh: dynamicMwh * scaledBy },
    band: request.byExponent.map(({ exponent, offsetDeg, standingDeg }) => ({
      exponent,
      offsetDeg,
      standingDeg,
      staticAnnualMwh: staticMwh(standingDeg, exponent) * scaledBy,
    })),
    note:
      'from interval means over all producing rows that are not limited; a year is the window scaled to 8766 h over ' +
      'the hours with rows, and holds no wind but that of the window',
  }
}

/**
 * Energy that rows gain when their yaw error changes from the first to the second angle of `errorsDeg`, MWh.
 *
 * @param producing.basePower  the curve's answer at the rows' wind speeds, kW; length as `rows`.
 */
function gainMwh(
  frame: TurbineFrame,
  producing: { rows: readonly number[]; basePower: Float64Array },
  hoursPerRow: number,
  exponent: number,
  errorsDeg: (vaneDeg: number) => readonly [number, number],
): number {
  const rated = Number.isNaN(frame.ratedPowerKw) ? Infinity : frame.ratedPowerKw
  const { rows, basePower } = producing
  let gainKw = 0
  for (let k = 0; k < rows.length; k++) {
    const i = rows[k]!
    const power = basePower[k]!
    if (Number.isNaN(power)) continue // no curve there: below cut-in or far above rated, where yaw changes nothing seen
    const [now, then] = errorsDeg(frame.vane[i]!)
    const ratio = cosine(then) / cosine(now)
    const faced = powerAt(frame.curve, frame.normalisedSpeed[i]! * ratio ** (exponent / 3))
    // Beyond the last bin the curve has no answer: the turbine is at what it showed at most.
    gainKw += Math.min(rated, Number.isNaN(faced) ? power : faced) - Math.min(rated, power)
  }
  return (gainKw * hoursPerRow) / KWH_PER_MWH
}

function cosine(angleDeg: number): number {
  return Math.cos(Math.min(MAX_YAW_ERROR_DEG, Math.abs(wrap180(angleDeg))) * RAD_PER_DEG)
}

function producingRows(frame: TurbineFrame): number[] {
  return runningRows(frame).filter((i) => frame.limited[i] === 0)
}

function runningRows(frame: TurbineFrame): number[] {
  const rows: number[] = []
  for (let i = 0; i < frame.time.length; i++) if (frame.running[i] === 1) rows.push(i)
  return rows
}

function sumOver(rows: readonly number[], valueOf: (row: number) => number): number {
  return rows.reduce((sum, i) => sum + valueOf(i), 0)
}
