import { powerAt, type MeasuredCurve } from '../../kernel/wind/index.ts'

const STEP_MS = 0.05

/** A measured curve as a rising table, read both ways. */
export interface CurveBothWays {
  /** kW at a wind speed, m/s; beyond the ends the curve's own ends. */
  power(speedMs: number): number
  /** m/s at which the curve first gives that power, kW; beyond the ends the curve's own ends. */
  speed(powerKw: number): number
}

/** @returns null for a curve with fewer than two points. */
export function curveBothWays(curve: MeasuredCurve): CurveBothWays | null {
  const first = curve.speedsMs[0]
  const last = curve.speedsMs.at(-1)
  if (first === undefined || last === undefined || !(last > first)) return null
  const n = Math.floor((last - first) / STEP_MS) + 1
  const table = new Float64Array(n)
  let highest = -Infinity
  for (let k = 0; k < n; k++) {
    const power = powerAt(curve, Math.min(last, first + k * STEP_MS))
    if (power > highest) highest = power // a dip, and a gap, are bridged
    table[k] = highest
  }
  if (!Number.isFinite(table[0]!)) return null
  return {
    power(speedMs) {
      const at = Math.max(0, Math.min(n - 1, (speedMs - first) / STEP_MS))
      const k = Math.min(n - 2, Math.floor(at))
      return table[k]! + (at - k) * (table[k + 1]! - table[k]!)
    },
    speed(powerKw) {
      if (Number.isNaN(powerKw)) return NaN
      let low = 0
      let high = n - 1
      if (!(powerKw > table[0]!)) return first
      if (powerKw >= table[high]!) return first + table.indexOf(table[high]!) * STEP_MS
      while (high - low > 1) {
        const middle = (low + high) >> 1
        if (table[middle]! < powerKw) low = middle
        else high = middle
      }
      return first + (low + (powerKw - table[low]!) / (table[high]! - table[low]!)) * STEP_MS
    },
  }
}
