import { medianOf, quantileOf } from '../../kernel/stats/index.ts'
import type { FarmDirection } from './farm-direction.ts'
import type { FarmGrid, GridChannel } from './farm-grid.ts'

const BIN_DEG = 5
const BINS = 360 / BIN_DEG
/** Rows of a turbine in a bin below which the bin says nothing. */
const MIN_ROWS = 12
/** A bin this far below the turbine's usual share of the farm's wind speed lies in a wake (ln). */
const WAKE_DEPTH = 0.06

/** Where and when turbines stand in free stream: [i][t], 1 = free. */
export type FreeStream = readonly Uint8Array[]

/**
 * Tells waked sectors from the wind speeds themselves: a turbine whose speed, relative to the farm's median, drops in a
 * sector stands behind something there. The sector and its neighbours are left out, since in the edge of a wake the
 * speed depends on direction. Neither layout nor north is needed; terrain that does the same is left out too.
 *
 * @param logSpeed  ln of wind speed, [i][t].
 * @param farmLogSpeed  median of the farm, [t].
 */
export function freeStream(
  grid: FarmGrid,
  direction: FarmDirection,
  logSpeed: GridChannel,
  farmLogSpeed: Float64Array,
): FreeStream {
  const binOf = (t: number): number => Math.floor(direction.consensusDeg[t]! / BIN_DEG) % BINS
  return logSpeed.map((values) => {
    const byBin = Array.from({ length: BINS }, (): number[] => [])
    for (let t = 0; t < grid.length; t++) {
      const difference = values[t]! - farmLogSpeed[t]!
      const bin = binOf(t)
      if (!Number.isNaN(difference) && !Number.isNaN(bin)) byBin[bin]!.push(difference)
    }
    const level = byBin.map((list) => (list.length >= MIN_ROWS ? medianOf(list) : NaN))
    const usual = quantileOf(level, 0.7)
    const waked = level.map((value) => value < usual - WAKE_DEPTH)
    const closed = waked.map((own, b) => own || waked[(b + 1) % BINS]! || waked[(b + BINS - 1) % BINS]!)
    const free = new Uint8Array(grid.length)
    for (let t = 0; t < grid.length; t++) {
      const bin = binOf(t)
      free[t] = Number.isNaN(bin) || closed[bin] ? 0 : 1
    }
    return free
  })
}
