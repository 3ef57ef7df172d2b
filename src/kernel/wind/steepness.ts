/** Spacing of the table as a share of the bin width: straight lines between its entries are right to 0.1 %. */
const STEPS_PER_BIN = 4
/** Reach of the window to either side in ln u: short enough for a steepness that falls from 6 to 4 within 1 m/s. */
const REACH_LN = 0.2
/** The reach stays within these in m/s: three bins at low speed, and away from the knee at high speed. */
const LEAST_REACH_MS = 0.9
const MOST_REACH_MS = 1.8
/** At the ends and beside gaps the reach grows until it holds three points, this much beyond the third, up to a limit. */
const BEYOND_THIRD = 1.25
const WIDEST_REACH_MS = 2.5
/** A smaller determinant of the normal equations, as a share of its diagonal's product, means that points coincide. */
const SINGULAR = 1e-9

/** d ln P / d ln u on an even grid of speeds; NaN where the points do not determine it. */
export interface SteepnessTable {
  firstMs: number
  lastMs: number
  stepMs: number
  values: Float64Array
}

/**
 * Local steepness of points of a power curve: at each speed of the grid the slope of a parabola of ln P over ln u,
 * fitted to the points within 0.2 in ln u (but 0.9 to 1.8 m/s), weighted by counts and by tricube weights of the distance.
 *
 * Noise-free the steepness of u^3 is exact, and one that falls from 6 at 4.5 m/s to 4 at 5.5 is 1.3 % too steep; with
 * 10 % noise and 60 rows a bin its standard error is 2.5 to 4 %. At the ends and beside gaps the reach grows to hold three
 * points. Within about 1.5 m/s of the knee it mixes the two sides.
 *
 * @param speedsMs  m/s, rising, > 0; length n.
 * @param powersKw  length n; points with a power that is not above 0 are left out.
 * @param counts  weights, >= 0; length n.
 * @param binWidthMs  the grid runs from half a bin before the first point to half a bin after the last.
 */
export function steepnessTable(
  speedsMs: Float64Array,
  powersKw: Float64Array,
  counts: Float64Array,
  binWidthMs: number,
): SteepnessTable {
  const n = speedsMs.length
  const stepMs = binWidthMs / STEPS_PER_BIN
  if (n === 0) return { firstMs: NaN, lastMs: NaN, stepMs, values: new Float64Array(0) }
  const firstMs = speedsMs[0]! - binWidthMs / 2
  const lastMs = speedsMs[n - 1]! + binWidthMs / 2
  // One entry past the end, so that the whole span lies between entries.
  const values = new Float64Array(Math.floor((lastMs - firstMs) / stepMs) + 2).fill(NaN)
  const table = { firstMs, lastMs, stepMs, values }

  const usable = (_: number, i: number) => powersKw[i]! > 0 && speedsMs[i]! > 0
  const lnSpeeds = speedsMs.filter(usable).map(Math.log)
  const lnPowers = powersKw.filter(usable).map(Math.log)
  const weights = counts.filter(usable)
  if (lnSpeeds.length < 3) return table
  let nearest = 0
  for (let i = 0; i < values.length; i++) {
    const speed = firstMs + i * stepMs
    if (!(speed > 0)) continue
    const centre = Math.log(speed)
    // The three nearest points are neighbours: move on while the next three lie nearer.
    while (nearest + 3 < lnSpeeds.length && lnSpeeds[nearest + 3]! - centre < centre - lnSpeeds[nearest]!)
      nearest++
    const third = Math.max(centre - lnSpeeds[nearest]!, lnSpeeds[nearest + 2]! - centre)
    const reach = Math.max(
      Math.log1p(LEAST_REACH_MS / speed),
      Math.min(REACH_LN, Math.log1p(MOST_REACH_MS / speed)),
      Math.min(BEYOND_THIRD * third, Math.log1p(WIDEST_REACH_MS / speed)),
    )
    let lowest = nearest
    while (lowest > 0 && lnSpeeds[lowest - 1]! > centre - reach) lowest--
    values[i] = slopeAt(centre, reach, lowest, lnSpeeds, lnPowers, weights)
  }
  return table
}

/**
 * d ln P / d ln u of a measured curve at a speed, interpolated in its table.
 *
 * @returns no unit. NaN outside the first to last point, each widened by half a bin, and where fewer than three points
 *   with a power above 0 lie within 2.5 m/s.
 */
export function steepnessAt(curve: { steepness: SteepnessTable }, speedMs: number): number {
  const { firstMs, lastMs, stepMs, values } = curve.steepness
  if (!(speedMs >= firstMs && speedMs <= lastMs)) return NaN
  const position = (speedMs - firstMs) / stepMs
  const i = Math.min(Math.floor(position), values.length - 2)
  return values[i]! + (position - i) * (values[i + 1]! - values[i]!)
}

/** Slope at `centre` of the weighted parabola through the points in reach, from `lowest` on. */
function slopeAt(
  centre: number,
  reach: number,
  lowest: number,
  xs: Float64Array,
  ys: Float64Array,
  counts: Float64Array,
): number {
  // t is the distance in units of the reach; ln P is counted from the first point, so that digits are kept.
  let s0 = 0
  let s1 = 0
  let s2 = 0
  let s3 = 0
  let s4 = 0
  let y0 = 0
  let y1 = 0
  let y2 = 0
  let points = 0
  let origin = NaN
  for (let j = lowest; j < xs.length && xs[j]! < centre + reach; j++) {
    const t = (xs[j]! - centre) / reach
    const size = Math.abs(t)
    if (!(size < 1)) continue
    const y = ys[j]!
    if (points === 0) origin = y
    const closeness = 1 - size * size * size
    const weight = counts[j]! * closeness * closeness * closeness
    const rise = y - origin
    s0 += weight
    s1 += weight * t
    s2 += weight * t * t
    s3 += weight * t * t * t
    s4 += weight * t * t * t * t
    y0 += weight * rise
    y1 += weight * t * rise
    y2 += weight * t * t * rise
    points++
  }
  if (points < 3) return NaN
  // Cramer's rule for the middle coefficient of the 3 x 3 normal equations.
  const determinant = s0 * (s2 * s4 - s3 * s3) - s1 * (s1 * s4 - s3 * s2) + s2 * (s1 * s3 - s2 * s2)
  if (!(determinant > SINGULAR * s0 * s2 * s4)) return NaN
  const middle = s0 * (y1 * s4 - s3 * y2) - y0 * (s1 * s4 - s3 * s2) + s2 * (s1 * y2 - y1 * s2)
  return middle / determinant / reach
}
