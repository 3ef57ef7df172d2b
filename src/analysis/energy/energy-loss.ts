import { circularMean, wrap180 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import { BINNED_NOT_A_TEST, type LongTerm, type TurbineSheet } from '../../sheet/index.ts'
import { runningBelowRated } from '../vane-statistics.ts'
import { curveCheck, suppliedCurve } from './curve-check.ts'
import { gainRows, gainsKw, knownRows } from './gains.ts'
import { priceAt, type Prices } from './prices.ts'
import { yearAhead, type Year } from './year-ahead.ts'

const KWH_PER_MWH = 1000
/** Misalignments whose cost is told beside the estimate's, degrees. */
const SHOWN_DEG = [-9, -6, -3, 3, 6, 9] as const

type EnergyLoss = TurbineSheet['energyLoss']

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
  /** What a year's wind is judged by; absent: nothing. */
  readonly longTerm?: LongTerm | undefined
  /** Absent or null: no money. */
  readonly prices?: Prices | null
}

/**
 * What the yaw error costs, from the measured curve, which already contains the offset.
 *
 * Static: a row at wind speed u with yaw error g = v + d would, after m is corrected, stand at g - m. Its gain is
 * P(u [cos(g - m) / cos(g)]^(p/3)) - P(u), capped at rated. With a vane that averages 0 this is the design's
 * [cos(v) / cos(v + d)]; with one that does not, the mean vane stays out of the gain. Dynamic: what the same rows would
 * gain on top of that if the rotor faced the wind in every interval. Over all producing rows that are not limited.
 *
 * The window is filled: gaps are taken to lose at the rate of the rest. The year is another matter, see `yearAhead`.
 */
export function energyLoss(frame: TurbineFrame, request: EnergyLossRequest): EnergyLoss {
  const { exponent, offset } = request
  const hoursPerRow = frame.intervalS / 3600
  const n = frame.time.length
  const known = knownRows(frame)
  const producing = gainRows(frame)
  const hours = known.reduce((sum, one) => sum + one, 0) * hoursPerRow
  const windowHours = n > 0 ? (frame.time[n - 1]! - frame.time[0]!) / 3.6e6 + hoursPerRow : 0
  const gapsScaledBy = hours > 0 ? windowHours / hours : NaN
  const year = yearAhead(frame, known, producing, request.longTerm, windowHours)
  let producedMwh = 0
  let rows = 0
  for (let i = 0; i < n; i++) {
    if (frame.running[i] !== 1) continue
    producedMwh += (frame.power[i]! * hoursPerRow) / KWH_PER_MWH
    if (frame.limited[i] === 0) rows++
  }
  const common = {
    exponent,
    producedMwh,
    hours,
    windowHours,
    gapHours: Math.max(0, windowHours - hours),
    gapsScaledBy,
    rows,
    curveCheck: curveCheck(frame),
    suppliedCurve: suppliedCurve(frame, { curveMeanMs: year.curveMeanMs, printedMeanMs: year.meanMs }),
  }
  if (!offset) return { ...common, ...withoutOffset(year) }

  const meanVaneDeg = wrap180(circularMean(runningBelowRated(frame).map((i) => frame.vane[i]!)).direction)
  /** Gains of the rows if the rotor stands off by `standingDeg` and that is corrected, kW. */
  const staticGains = (standingDeg: number, p: number): Float64Array =>
    gainsKw(frame, producing, p, (vane) => {
      const error = vane - meanVaneDeg + standingDeg
      return [error, error - standingDeg]
    })
  const seenMwh = (gains: Float64Array): number =>
    (gains.reduce((sum, kw) => sum + kw, 0) * hoursPerRow) / KWH_PER_MWH
  const windowMwh = (gains: Float64Array): number => seenMwh(gains) * gapsScaledBy

  const at = staticGains(offset.standingDeg, exponent)
  const [low, high] = offset.standingInterval95Deg
  const [lowExponent, highExponent] = offset.endExponents ?? [exponent, exponent]
  const ends = [staticGains(low, lowExponent), staticGains(high, highExponent)]
  const lowest = low <= 0 && high >= 0 ? 0 : null
  const interval = (energyOf: (gains: Float64Array) => number): [number, number] => {
    const energies = ends.map(energyOf)
    return [lowest ?? Math.max(0, Math.min(...energies)), Math.max(...energies)]
  }
  const faced = gainsKw(frame, producing, exponent, (vane) => [vane - meanVaneDeg + offset.standingDeg, 0])
  const dynamic = faced.map((gain, k) => gain - at[k]!)
  const shown = SHOWN_DEG.map((standingDeg) => ({ standingDeg, gains: staticGains(standingDeg, exponent) }))
  const { rangeMwh, meansMs } = year.rangeOf(at)
  const annualInterval = interval((gains) => year.energyOf(gains))
  const annualMwh = year.energyOf(at)
  return {
    ...common,
    static: {
      windowMwh: windowMwh(at),
      windowInterval95Mwh: interval(windowMwh),
      recoverablePctOfProduced: producedMwh > 0 ? (100 * seenMwh(at)) / producedMwh : NaN,
      annualMwh,
      annualInterval95Mwh: annualInterval,
      byMisalignment: shown.map(({ standingDeg, gains }) => ({
        standingDeg,
        windowMwh: windowMwh(gains),
        annualMwh: year.energyOf(gains),
      })),
    },
    dynamic: { windowMwh: windowMwh(dynamic), annualMwh: year.energyOf(dynamic) },
    yearAhead: {
      ...yearHead(year),
      rangeMwh,
      rangeMeanWindSpeedMs: meansMs,
      byMeanWindSpeed: year.table({ at, ends, low: lowest, dynamic }),
    },
    value: worth(frame, request.prices ?? null, {
      rows: producing.rows,
      at,
      // Which hours and months a correction pays in does not hang on its size.
      typical: shown.find(({ standingDeg }) => standingDeg === (offset.standingDeg < 0 ? -6 : 6))!.gains,
      windowMwh: windowMwh(at),
      annualMwh,
      annualInterval,
    }),
    band: request.byExponent.map(({ exponent: p, offsetDeg, standingDeg }) => {
      const gains = staticGains(standingDeg, p)
      return {
        exponent: p,
        offsetDeg,
        standingDeg,
        staticWindowMwh: windowMwh(gains),
        staticAnnualMwh: year.energyOf(gains),
      }
    }),
    note:
      'from interval means over all producing rows that are not limited, at most rated power; gaps of the window are taken to lose at the ' +
      `rate of the rest; the curve is ${BINNED_NOT_A_TEST}`,
  }
}

function withoutOffset(year: Year) {
  return {
    static: {
      windowMwh: null,
      windowInterval95Mwh: [null, null],
      recoverablePctOfProduced: null,
      annualMwh: null,
      annualInterval95Mwh: [null, null],
      byMisalignment: [],
    },
    dynamic: { windowMwh: null, annualMwh: null },
    yearAhead: {
      ...yearHead(year),
      rangeMwh: [null, null],
      rangeMeanWindSpeedMs: [null, null],
      byMeanWindSpeed: year.table(null),
    },
    value: null,
    band: [],
    note: 'no loss without an offset',
  }
}

function yearHead(year: Year) {
  const { basis, note, meanMs, windowMeanMs } = year
  return { basis, note, meanWindSpeedMs: meanMs, windowMeanWindSpeedMs: windowMeanMs }
}

interface Recovered {
  readonly rows: Int32Array
  readonly at: Float64Array
  readonly typical: Float64Array
  readonly windowMwh: number
  readonly annualMwh: number
  readonly annualInterval: readonly [number, number]
}

/** What the static loss is worth: the window at the prices of its rows, the year at the price it is valued at. */
function worth(frame: TurbineFrame, prices: Prices | null, recovered: Recovered): EnergyLoss['value'] {
  if (prices === null) return null
  const { rows, windowMwh, annualMwh, annualInterval } = recovered
  const meanPrice = (weights: Float64Array): number => {
    if (prices.slots === null) return prices.flatPerMwh
    let sum = 0
    let total = 0
    for (let k = 0; k < rows.length; k++) {
      sum += weights[k]! * priceAt(prices, frame.time[rows[k]!]!)
      total += weights[k]!
    }
    return total > 0 ? sum / total : NaN
  }
  const typicalPrice = meanPrice(recovered.typical)
  const windowPrice = windowMwh > 0 ? meanPrice(recovered.at) : typicalPrice
  const annualPrice = Number.isNaN(prices.annualPerMwh) ? typicalPrice : prices.annualPerMwh
  const ends = annualInterval.map((mwh) => mwh * annualPrice)
  return {
    currency: prices.currency,
    windowPricePerMwh: windowPrice,
    annualPricePerMwh: annualPrice,
    window: windowMwh * windowPrice,
    annual: annualMwh * annualPrice,
    annualInterval95: [Math.min(...ends), Math.max(...ends)],
    note: prices.note,
  }
}
