/** Values closer than this are one code: what parsing and scaling leave, relative to the spread of the series. */
const SAME = 1e-9

/** The distinct values of a quantised series, rising, and how often each was read. */
export interface CodesVisited {
  readonly codes: Float64Array
  readonly counts: Float64Array
  /** Values read, missing ones not counted. */
  readonly samples: number
}

/**
 * Which codes of a converter or an encoder disc a series visits: a disc of 64 codes with a dead track shows 32.
 *
 * @param values  length n; NaN = missing.
 */
export function codesVisited(values: Float64Array): CodesVisited {
  const sorted = values.filter((value) => !Number.isNaN(value)).sort()
  const samples = sorted.length
  const apart = samples > 0 ? SAME * Math.max(1, sorted[samples - 1]! - sorted[0]!) : 0
  const codes = new Float64Array(samples)
  const counts = new Float64Array(samples)
  let distinct = 0
  for (let i = 0; i < samples; i++) {
    if (distinct === 0 || sorted[i]! - codes[distinct - 1]! > apart) codes[distinct++] = sorted[i]!
    counts[distinct - 1]!++
  }
  return { codes: codes.slice(0, distinct), counts: counts.slice(0, distinct), samples }
}
