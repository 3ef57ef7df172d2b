import { medianOf, quantileOf } from '../kernel/stats/index.ts'
import type { TurbineColumns } from './frame.ts'
import type { SensorSpell } from './still-spells.ts'

/** Ice is looked for up to this air temperature, degrees C; above the second one a reading is taken as free of ice. */
const ICE_MAX_C = 2
const WARM_MIN_C = 3
/** Fewer neighbours than this in a row have no majority. */
const FEWEST_OTHERS = 2
/** Below this wind speed of the neighbours ratios say little, m/s. */
const COMPARED_MIN_MS = 4
/** Rows without ice from which the ratio's own lower end is taken; with fewer, the ratio must fall below the share given. */
const FEW_WARM_ROWS = 300
const LOW_QUANTILE = 0.002
const SHARE_WITHOUT_WARM_ROWS = 0.55
/** How far the ratio (ln) must fall below all that is usual without ice, wakes included. */
const BELOW_USUAL = 0.15
/** Shorter spells may be a front or a gust. */
const LEAST_MS = 3_600_000
/** A cup that stands still reads 0. */
const LEAST_SHARE = 0.02

export interface IcedAnemometer {
  readonly spells: readonly SensorSpell[]
  /** 1 = inside a spell; length n. */
  readonly inside: Uint8Array
}

/**
 * Spells near or below freezing in which an anemometer reads less, against the median of its neighbours, than it ever does
 * in warmer air - in no wake and in no sector. Judged by that ratio alone: power says nothing here, since rows that are
 * picked by power bend every offset that is fitted to them. When most of a farm ices at once nothing is seen.
 *
 * @returns one per turbine, in order; nothing where there are fewer than three turbines or no air temperature.
 */
export function icedAnemometers(farm: readonly TurbineColumns[], intervalMs: number): IcedAnemometer[] {
  const slotOf = (at: number): number => Math.round(at / intervalMs)
  const isCold = farm.some(({ numbers }) => numbers['air_temperature']?.some((value) => value <= ICE_MAX_C))
  const readings =
    isCold && farm.length > FEWEST_OTHERS ? sortedBySlot(farm, slotOf) : new Map<number, Float64Array>()
  return farm.map((columns) => {
    const none = { spells: [], inside: new Uint8Array(columns.time.length) }
    const temperature = columns.numbers['air_temperature']
    const speed = columns.numbers['wind_speed']
    if (farm.length <= FEWEST_OTHERS || !isCold || !temperature || !speed) return none
    const ratio = Float64Array.from(columns.time, (at, i) => {
      const usual = medianOfOthers(readings.get(slotOf(at)), speed[i]!)
      if (!(usual >= COMPARED_MIN_MS)) return NaN
      return Math.log(Math.max(LEAST_SHARE, speed[i]! / usual))
    })
    return spellsOf(columns, runningMedian(ratio), temperature, intervalMs)
  })
}

/** Wind speeds of all turbines at each time, in rising order. */
function sortedBySlot(
  farm: readonly TurbineColumns[],
  slotOf: (at: number) => number,
): Map<number, Float64Array> {
  const bySlot = new Map<number, number[]>()
  for (const { time, numbers } of farm) {
    const speed = numbers['wind_speed']
    if (!speed) continue
    for (let i = 0; i < time.length; i++) {
      if (Number.isNaN(speed[i]!)) continue
      const slot = slotOf(time[i]!)
      const there = bySlot.get(slot)
      if (there) there.push(speed[i]!)
      else bySlot.set(slot, [speed[i]!])
    }
  }
  return new Map([...bySlot].map(([slot, there]) => [slot, Float64Array.from(there).sort()]))
}

/** Median of the readings without the turbine's own; NaN with fewer than two others. */
function medianOfOthers(sorted: Float64Array | undefined, own: number): number {
  if (!sorted) return NaN
  const at = Number.isNaN(own) ? sorted.length : sorted.indexOf(own)
  const count = sorted.length - (at < sorted.length ? 1 : 0)
  if (count < FEWEST_OTHERS) return NaN
  const other = (rank: number): number => sorted[rank < at ? rank : rank + 1]!
  return (other((count - 1) >> 1) + other(count >> 1)) / 2
}

function spellsOf(
  { time, numbers }: TurbineColumns,
  ratio: Float64Array,
  temperature: Float64Array,
  intervalMs: number,
): IcedAnemometer {
  const n = time.length
  const inside = new Uint8Array(n)
  const spells: SensorSpell[] = []
  const warm = ratio.filter((value, i) => temperature[i]! >= WARM_MIN_C && !Number.isNaN(value))
  const known = warm.length >= FEW_WARM_ROWS
  const usualLow = known
    ? quantileOf(warm, LOW_QUANTILE)
    : medianOf(ratio) + Math.log(SHARE_WITHOUT_WARM_ROWS)
  const low = known ? usualLow - BELOW_USUAL : usualLow
  const leastRows = Math.max(3, Math.ceil(LEAST_MS / intervalMs))
  const isCold = (i: number): boolean => temperature[i]! <= WARM_MIN_C
  for (let i = 0; i < n; i++) {
    if (!(ratio[i]! < low && temperature[i]! <= ICE_MAX_C) || inside[i] === 1) continue
    let start = i
    let end = i + 1
    let deep = 1
    // Ice grows and melts: the spell reaches as far as the ratio stays below what is usual.
    while (start > 0 && ratio[start - 1]! < usualLow && isCold(start - 1)) start--
    while (end < n && (ratio[end]! < usualLow || Number.isNaN(ratio[end]!)) && isCold(end)) {
      if (ratio[end]! < low) deep++
      end++
    }
    while (end > start && Number.isNaN(ratio[end - 1]!)) end--
    if (deep < leastRows) continue
    inside.fill(1, start, end)
    spells.push({
      fromMs: time[start]!,
      toMs: time[end - 1]! + intervalMs,
      rows: end - start,
      value: Math.exp(medianOf(ratio.subarray(start, end)) - medianOf(ratio)),
      airTemperatureC: medianOf((numbers['air_temperature'] ?? temperature).subarray(start, end)),
      recordHeld: false,
    })
  }
  return { spells, inside }
}

/** Median of each value with the ones before and after it, so that a single row makes no spell. */
function runningMedian(values: Float64Array): Float64Array<ArrayBuffer> {
  return Float64Array.from(values, (value, i) =>
    Number.isNaN(value) ? NaN : medianOf([values[i - 1] ?? NaN, value, values[i + 1] ?? NaN]),
  )
}
