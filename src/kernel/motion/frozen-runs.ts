import { InputError } from '../../errors.ts'

/** Runs of a value that does not change; one entry per run, in order. */
export interface FrozenRuns {
  /** Index of the first sample. */
  readonly start: Int32Array
  /** Samples from the first to the last, missing ones between them included. */
  readonly length: Int32Array
}

/**
 * Stretches over which a series keeps exactly one value.
 *
 * @param values       length n; NaN = missing: neither breaks a run nor begins or ends one.
 * @param leastLength  samples, >= 2: shorter runs are left out.
 * @param tolerance    values this near to the run's first count as the same, >= 0. Default 0.
 * @throws InputError OUT_OF_RANGE
 */
export function frozenRuns(values: Float64Array, leastLength: number, tolerance = 0): FrozenRuns {
  if (!(leastLength >= 2)) {
    throw new InputError('OUT_OF_RANGE', `leastLength: expected >= 2, got ${leastLength}`)
  }
  if (!(tolerance >= 0)) throw new InputError('OUT_OF_RANGE', `tolerance: expected >= 0, got ${tolerance}`)
  const start: number[] = []
  const length: number[] = []
  let first = -1
  let last = -1
  let held = NaN
  const close = (): void => {
    if (first >= 0 && last - first + 1 >= leastLength) {
      start.push(first)
      length.push(last - first + 1)
    }
  }
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!
    if (Number.isNaN(value)) continue
    if (!(Math.abs(value - held) <= tolerance)) {
      close()
      first = i
      held = value
    }
    last = i
  }
  close()
  return { start: Int32Array.from(start), length: Int32Array.from(length) }
}
