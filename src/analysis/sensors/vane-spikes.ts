import { circularMedian, wrap180 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import { notTested, tested, type SensorReport } from './sensor-report.ts'

const TEST = 'spikes'
/** Extremes of an interval this far from its mean, in its own SDs, are no gust: of 600 normal values the largest is at 3.2. */
const EXTREME_SDS = 8
/** ... and this many degrees. */
const EXTREME_DEG = 40
/** A row this far from rows that agree with each other, degrees. */
const ROW_DEG = 40
const AGREE_DEG = 10
const WIND_MS = 4
/** Single ones may be a squall. */
const LEAST_SPIKES = 5

/** Readings that jump away and back while the turbine runs: a loose plug, a worn potentiometer, interference. */
export function vaneSpikes(frame: TurbineFrame): SensorReport {
  if (frame.vaneSource !== 'vane') return notTested('vane', TEST, 'needs a logged vane')
  const { vane, vaneSd, vaneMin, vaneMax, windSpeed, running, time } = frame
  const hasExtremes = vaneMin.some((value) => !Number.isNaN(value))
  const hasSd = vaneSd.some((value) => !Number.isNaN(value))
  const spikes: number[] = []
  let largest = 0
  let looked = 0
  for (let i = 0; i < time.length; i++) {
    if (running[i] !== 1 || !(windSpeed[i]! >= WIND_MS)) continue
    looked++
    let away = 0
    if (hasExtremes && hasSd) {
      const extreme = Math.max(vane[i]! - vaneMin[i]!, vaneMax[i]! - vane[i]!)
      if (extreme > EXTREME_DEG && extreme > EXTREME_SDS * vaneSd[i]!) away = extreme
    }
    const around = [i - 2, i - 1, i + 1, i + 2].map((j) => (running[j] === 1 ? vane[j]! : NaN))
    if (away === 0 && around.every((value) => !Number.isNaN(value))) {
      const centre = circularMedian(around)
      const agree = around.every((value) => Math.abs(wrap180(value - centre)) <= AGREE_DEG)
      const off = Math.abs(wrap180(vane[i]! - centre))
      if (agree && off > ROW_DEG) away = off
    }
    if (away === 0) continue
    spikes.push(i)
    largest = Math.max(largest, away)
  }
  const note =
    hasExtremes && hasSd
      ? `lowest and highest of ${looked} rows, and rows against rows`
      : `${looked} rows against rows; vane_min, vane_max or high-rate rows would show more`
  if (spikes.length < LEAST_SPIKES) return tested('vane', TEST, note)
  return tested('vane', TEST, note, [
    {
      sensor: 'vane',
      kind: 'spikes',
      finding: `the vane jumps away and back in ${spikes.length} of ${looked} running rows, by up to ${largest.toFixed(0)} degrees`,
      severity: 'warn',
      howSure: 'likely',
      checkFirst:
        'At the desk: record the vane at its fastest rate for an hour. Then climb: plug, cable shield, slip ring of the vane, track of a potentiometer.',
      from: new Date(time[spikes[0]!]!).toISOString(),
      to: new Date(time[spikes.at(-1)!]! + frame.intervalS * 1000).toISOString(),
      detail: { rows: spikes.length, ofRows: looked, largestDeg: largest },
    },
  ])
}
