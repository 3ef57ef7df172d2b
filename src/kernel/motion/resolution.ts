/** Differences up to this share of all, in order of size, are taken as rest: a nacelle stands most of the time. */
const REST_SHARE = 0.9
/** RMS of the smallest 90 % of normal values, in units of their SD. */
const TRIMMED_RMS = 0.7907
/** Smaller differences are rounding, degrees. */
const ROUNDING_DEG = 1e-9

/** How finely an angle is read. */
export interface Resolution {
  /** Smallest usual change of the reading, degrees; 0 = the reading never changes. */
  readonly stepDeg: number
  /** SD of the reading about its level at rest, degrees. */
  readonly noiseDeg: number
  /** Usual time between samples, s; NaN with fewer than two. */
  readonly sampleS: number
}

/**
 * Step, noise and sampling of an angle that stands still most of the time, from differences of neighbours.
 *
 * @param timeS    s, rising; length n.
 * @param angleDeg degrees on any scale; length n; NaN = missing.
 */
export function resolutionOf(timeS: Float64Array, angleDeg: Float64Array): Resolution {
  const n = timeS.length
  const intervals = new Float64Array(Math.max(0, n - 1))
  const sizes = new Float64Array(Math.max(0, n - 1))
  let known = 0
  for (let i = 1; i < n; i++) {
    intervals[i - 1] = timeS[i]! - timeS[i - 1]!
    const delta = angleDeg[i]! - angleDeg[i - 1]!
    if (delta - delta === 0) sizes[known++] = Math.abs(delta - 360 * Math.round(delta / 360))
  }
  const sampleS = n > 1 ? intervals.sort()[(n - 1) >> 1]! : NaN
  const sorted = sizes.subarray(0, known).sort()
  const rest = Math.floor(REST_SHARE * known)
  let squares = 0
  for (let i = 0; i < rest; i++) squares += sorted[i]! * sorted[i]!
  const noiseDeg = rest > 0 ? Math.sqrt(squares / rest) / (TRIMMED_RMS * Math.SQRT2) : 0
  const changes = tenth(sorted)
  if (Number.isNaN(changes)) return { stepDeg: 0, noiseDeg, sampleS }
  // Between two samples a nacelle may turn by many steps; the levels at which it rests are then nearer to one another.
  const levels = tenth(gapsOfLevels(angleDeg))
  return { stepDeg: levels < changes ? levels : changes, noiseDeg, sampleS }
}

/** The tenth smallest of a hundred that are not 0: a single odd difference, made by averaging, is not the step. */
function tenth(sorted: Float64Array): number {
  let zero = 0
  while (zero < sorted.length && sorted[zero]! <= ROUNDING_DEG) zero++
  const kept = sorted.length - zero
  return kept > 0 ? sorted[zero + Math.floor(0.1 * kept)]! : NaN
}

/** Differences, in order of size, between neighbours among the values that were read twice running. */
function gapsOfLevels(angleDeg: Float64Array): Float64Array {
  const levels = new Float64Array(angleDeg.length)
  let count = 0
  for (let i = 1; i < angleDeg.length; i++) {
    if (Math.abs(angleDeg[i]! - angleDeg[i - 1]!) <= ROUNDING_DEG) levels[count++] = angleDeg[i]!
  }
  const sorted = levels.subarray(0, count).sort()
  for (let i = 0; i + 1 < count; i++) sorted[i] = sorted[i + 1]! - sorted[i]!
  return sorted.subarray(0, Math.max(0, count - 1)).sort()
}
