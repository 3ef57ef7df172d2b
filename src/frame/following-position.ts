import { wrap180 } from '../kernel/angle/index.ts'
import type { TurbineColumns } from './frame.ts'

/** A nacelle rarely turns further between neighbouring intervals while its turbine produces, degrees. Common practice, no source. */
const LARGE_TURN_DEG = 30
/** Share of such turns beyond which the reading is no position. Sound logs have below 0.02, angles at random 0.83. */
const MOST_LARGE_TURNS = 0.2
/** Fewer pairs of neighbouring rows say nothing. */
const FEW_PAIRS = 50

/**
 * Whether the nacelle position of a log follows a nacelle at all. One that jumps about is noise or another quantity: it
 * must not decide which rows of vane and power are used. True where it is not logged, or where the vane is worked out from it.
 *
 * Only rows that produce count: a stopped turbine may be turned by hand, or unwind its cables.
 */
export function followsNacelle({ time, numbers }: TurbineColumns, intervalMs: number): boolean {
  const { nacelle_position: position, power, vane } = numbers
  if (!position || !power || !vane) return true
  let pairs = 0
  let large = 0
  for (let i = 1; i < time.length; i++) {
    if (!(power[i]! > 0) || !(power[i - 1]! > 0) || !(time[i]! - time[i - 1]! <= 1.5 * intervalMs)) continue
    const turn = Math.abs(wrap180(position[i]! - position[i - 1]!))
    if (Number.isNaN(turn)) continue
    pairs++
    if (turn > LARGE_TURN_DEG) large++
  }
  return pairs < FEW_PAIRS || large <= MOST_LARGE_TURNS * pairs
}

/** The same rows without the nacelle position and its statistics. */
export function withoutPosition(columns: TurbineColumns): TurbineColumns {
  const numbers = Object.fromEntries(
    Object.entries(columns.numbers).filter(([name]) => !name.startsWith('nacelle_position')),
  )
  return { ...columns, numbers }
}
