import {
  annualEnergy,
  rayleighCumulative,
  weibullCumulative,
  weibullScale,
  weibullShapeFrom,
} from '../../kernel/wind/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { LongTerm, YearAtSpeed } from '../../sheet/index.ts'
import type { GainRows } from './gains.ts'

const BIN_MS = 0.5
/** A bin counts from this many minutes on, as in the standard's method of bins. */
const BIN_MINUTES = 30
/** Up to which speed the last bin's power is held for the extrapolated energy, m/s. */
const CUT_OUT_MS = 25
/** Mean wind speeds of the standard's table of energies, m/s. */
const TABLE_MEANS_MS = [4, 5, 6, 7, 8, 9, 10, 11] as const
/**
 * How far the mean of a year may lie from what is known of it, as a share: from a window shorter than most of a year, from
 * a whole year, from many years. Common practice, no source.
 */
const YEAR_SHARE = { part: 0.2, whole: 0.07, longTerm: 0.07 } as const
const WHOLE_YEAR_H = 8000
/** Points of the range at which the loss is worked out. */
const RANGE_POINTS = 5
/** A mean that is within this of one of the table's is not told twice, m/s. */
const SAME_MEAN_MS = 1e-9
/** As in the standard's sum. */
const HOURS_PER_YEAR = 8760

type Cumulative = (speedMs: number) => number

/** The wind that annual numbers stand for, and how gains of rows become energies of a year. */
export interface Year {
  readonly basis: 'long-term reference' | 'range over mean wind speeds' | 'none'
  readonly note: string
  /** On the scale of the nacelle anemometer; NaN without wind. */
  readonly meanMs: number
  readonly windowMeanMs: number
  /** The same mean on the scale of the curve: at 1.225 kg/m3 where density is known. */
  readonly curveMeanMs: number
  /** Energy of a year by gains of rows, MWh; NaN without wind. */
  energyOf(gains: Float64Array): number
  /** Least and most over the mean wind speeds that a year may have. */
  rangeOf(gains: Float64Array): { rangeMwh: [number, number]; meansMs: [number, number] }
  /** One line for each mean wind speed and distribution. */
  table(
    gains: {
      at: Float64Array
      ends: readonly Float64Array[]
      low: number | null
      dynamic: Float64Array
    } | null,
  ): YearAtSpeed[]
}

/**
 * A year ahead. With a long-term mean: a Weibull distribution where its shape is given, else the window's own distribution of
 * speeds, stretched to that mean. Without: the window tells no year; a Rayleigh distribution at its mean stands in the middle
 * of a range over mean wind speeds.
 *
 * Gains are averaged in bins of 0.5 m/s over all rows in which it is known what the turbine did, so that stops and limits
 * count as they did in the window, and summed as an annual energy in the manner of IEC 61400-12-1.
 *
 * @param known  1 = it is known what the turbine did; length of the frame.
 */
export function yearAhead(
  frame: TurbineFrame,
  known: Uint8Array,
  producing: GainRows,
  longTerm: LongTerm | undefined,
  windowHours: number,
): Year {
  const speeds: number[] = []
  let sum = 0
  let squares = 0
  let normalised = 0
  for (let i = 0; i < known.length; i++) {
    const speed = frame.windSpeed[i]!
    if (known[i] !== 1 || Number.isNaN(speed) || Number.isNaN(frame.normalisedSpeed[i]!)) continue
    speeds.push(frame.normalisedSpeed[i]!)
    sum += speed
    squares += speed * speed
    normalised += frame.normalisedSpeed[i]!
  }
  const windowMeanMs = sum / speeds.length
  const shape = weibullShapeFrom(
    windowMeanMs,
    Math.sqrt(Math.max(0, squares / speeds.length - windowMeanMs ** 2)),
  )
  const toCurve = normalised / sum
  const bins = binsOf(frame, known, producing)
  const energy = (gains: Float64Array, cumulative: Cumulative): number =>
    annualEnergy(bins.speedsMs, bins.meansOf(gains), cumulative, { binWidthMs: BIN_MS }).measuredMwh
  const rayleigh =
    (meanMs: number): Cumulative =>
    (speed) =>
      rayleighCumulative(speed, meanMs * toCurve)
  const weibull = (meanMs: number, k: number): Cumulative => {
    const scaleMs = weibullScale(meanMs * toCurve, k)
    return (speed) => weibullCumulative(speed, { scaleMs, shape: k })
  }
  const hasWind = windowMeanMs > 0
  const meanMs = longTerm?.meanWindSpeedMs ?? windowMeanMs
  const ownShape = longTerm?.weibullShape ?? shape
  const main = (gains: Float64Array): number => {
    if (longTerm === undefined) return energy(gains, rayleigh(meanMs))
    if (longTerm.weibullShape !== undefined) return energy(gains, weibull(meanMs, longTerm.weibullShape))
    return stretchedEnergy(speeds, meanMs / windowMeanMs, bins.speedsMs, bins.meansOf(gains))
  }
  const share =
    longTerm !== undefined
      ? YEAR_SHARE.longTerm
      : windowHours >= WHOLE_YEAR_H
        ? YEAR_SHARE.whole
        : YEAR_SHARE.part
  const { curve } = frame

  return {
    basis: !hasWind ? 'none' : longTerm === undefined ? 'range over mean wind speeds' : 'long-term reference',
    note: noteOf(hasWind, longTerm),
    meanMs: hasWind ? meanMs : NaN,
    windowMeanMs,
    curveMeanMs: meanMs * toCurve,
    energyOf: (gains) => (hasWind ? main(gains) : NaN),
    rangeOf(gains) {
      if (!hasWind) return { rangeMwh: [NaN, NaN], meansMs: [NaN, NaN] }
      const meansMs: [number, number] = [meanMs * (1 - share), meanMs * (1 + share)]
      const energies = [main(gains)]
      for (let k = 0; k < RANGE_POINTS; k++) {
        const at = meansMs[0] + (k / (RANGE_POINTS - 1)) * (meansMs[1] - meansMs[0])
        energies.push(energy(gains, rayleigh(at)))
        if (ownShape > 0) energies.push(energy(gains, weibull(at, ownShape)))
      }
      return { rangeMwh: [Math.min(...energies), Math.max(...energies)], meansMs }
    },
    table(gains) {
      if (!hasWind) return []
      const own = TABLE_MEANS_MS.some((mean) => Math.abs(mean - meanMs) < SAME_MEAN_MS) ? [] : [meanMs]
      return [...TABLE_MEANS_MS, ...own]
        .sort((a, b) => a - b)
        .flatMap((mean) => [
          { mean, distribution: 'Rayleigh' as const, shape: 2, cumulative: rayleigh(mean) },
          ...(ownShape > 0
            ? [
                {
                  mean,
                  distribution: 'Weibull' as const,
                  shape: ownShape,
                  cumulative: weibull(mean, ownShape),
                },
              ]
            : []),
        ])
        .map(({ mean, distribution, shape: k, cumulative }) => {
          const aep = annualEnergy(curve.speedsMs, curve.fittedKw, cumulative, { cutOutMs: CUT_OUT_MS })
          const ends = gains ? gains.ends.map((end) => energy(end, cumulative)) : []
          return {
            meanWindSpeedMs: mean,
            distribution,
            shape: k,
            aepMeasuredMwh: aep.measuredMwh,
            aepExtrapolatedMwh: aep.extrapolatedMwh,
            measuredShare: aep.measuredShare,
            complete: aep.complete,
            staticMwh: gains ? energy(gains.at, cumulative) : null,
            staticInterval95Mwh: gains
              ? [gains.low ?? Math.max(0, Math.min(...ends)), Math.max(...ends)]
              : [null, null],
            dynamicMwh: gains ? energy(gains.dynamic, cumulative) : null,
          }
        })
    },
  }
}

/** Mean gain by bin of wind speed; a bin with less than half an hour is NaN and bridged by the sum. */
function binsOf(frame: TurbineFrame, known: Uint8Array, { rows }: GainRows) {
  const binOf = (i: number): number => Math.floor(frame.normalisedSpeed[i]! / BIN_MS + 0.5)
  const counts: number[] = []
  const sums: number[] = []
  for (let i = 0; i < known.length; i++) {
    const bin = binOf(i)
    if (known[i] !== 1 || !(bin >= 0)) continue
    while (counts.length <= bin) {
      counts.push(0)
      sums.push(0)
    }
    counts[bin]!++
    sums[bin]! += frame.normalisedSpeed[i]!
  }
  const isFilled = counts.map((count) => (count * frame.intervalS) / 60 >= BIN_MINUTES)
  const bin = Int32Array.from(rows, binOf)
  return {
    speedsMs: counts.map((count, b) => (isFilled[b] ? sums[b]! / count : NaN)),
    meansOf(gains: Float64Array): Float64Array {
      const means = new Float64Array(counts.length)
      for (let k = 0; k < gains.length; k++) means[bin[k]!]! += gains[k]!
      return means.map((total, b) => (isFilled[b] ? total / counts[b]! : NaN))
    },
  }
}

/**
 * Energy of a year in which the wind blows as in a sample, each speed times a factor: the mean over the sample of the gain of
 * the bins, straight between their mean speeds. Half a bin beyond the first and the last there is nothing.
 */
function stretchedEnergy(
  sample: readonly number[],
  factor: number,
  binSpeedsMs: readonly number[],
  binMeans: Float64Array,
): number {
  const points = binSpeedsMs
    .map((speedMs, b) => ({ speedMs, kw: binMeans[b]! }))
    .filter(({ speedMs, kw }) => !Number.isNaN(speedMs) && !Number.isNaN(kw))
  const first = points[0]
  const last = points.at(-1)
  if (first === undefined || last === undefined) return NaN
  let sumKw = 0
  let i = 0
  for (const speedMs of Float64Array.from(sample, (speed) => speed * factor).sort()) {
    if (speedMs < first.speedMs - BIN_MS / 2 || speedMs > last.speedMs + BIN_MS / 2) continue
    while (i < points.length && points[i]!.speedMs < speedMs) i++
    const right = points[i] ?? last
    const left = points[i - 1] ?? first
    const share = right === left ? 0 : (speedMs - left.speedMs) / (right.speedMs - left.speedMs)
    sumKw += left.kw + share * (right.kw - left.kw)
  }
  return (HOURS_PER_YEAR * sumKw) / sample.length / 1000
}

function noteOf(hasWind: boolean, longTerm: LongTerm | undefined): string {
  if (!hasWind) return 'no wind speed: no year'
  if (longTerm === undefined) {
    return (
      'no long-term reference in the site file: how windy a year is cannot be told from this window. The annual numbers stand for ' +
      'a Rayleigh distribution at the mean of the window, and rangeMwh for the mean wind speeds that a year may have'
    )
  }
  const wind = `long-term mean ${longTerm.meanWindSpeedMs} m/s (${longTerm.source})`
  return longTerm.weibullShape === undefined
    ? `${wind}: the wind speeds of the window, stretched to that mean`
    : `${wind}: Weibull distribution of shape ${longTerm.weibullShape}`
}
