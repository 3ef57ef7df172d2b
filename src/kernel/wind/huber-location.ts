/** Tuning constant at which the estimate has 95 % of the mean's efficiency under normal noise. */
const HUBER_K = 1.345
/** Median absolute deviation of a normal distribution, as a share of its standard deviation. */
const NORMAL_MAD = 0.6744897501960817
const MAX_STEPS = 60

export interface HuberLocation {
  location: number
  /** Asymptotic standard error of the location; 0 when more than half of the values are the same. */
  standardError: number
}

/**
 * Middle of some values in which both tails count little but nothing is deleted: Huber's M-estimate of location with
 * the scale held at the median absolute deviation. Low and high outliers are treated alike.
 *
 * @param sorted  values in rising order, without NaN.
 * @param from, to  part of them to use, from inclusive, to exclusive.
 * @returns NaN twice for an empty part. Scale 0 (more than half of the values the same): their median.
 * @source Huber (1981), Robust Statistics, sections 5.2 and 6.4; k = 1.345.
 */
export function huberLocation(sorted: Float64Array, from: number, to: number): HuberLocation {
  const count = to - from
  if (!(count > 0)) return { location: NaN, standardError: NaN }
  const median = (sorted[from + ((count - 1) >> 1)]! + sorted[from + (count >> 1)]!) / 2
  const scale = medianDistance(sorted, from, to, median) / NORMAL_MAD
  if (!(scale > 0)) return { location: median, standardError: 0 }
  const cut = HUBER_K * scale

  // Newton on a falling, piecewise straight function, held inside the bracket of the values' range.
  let location = median
  let low = sorted[from]!
  let high = sorted[to - 1]!
  let inside = 0
  let square = 0
  for (let step = 0; step < MAX_STEPS; step++) {
    let pull = 0
    inside = 0
    square = 0
    for (let i = from; i < to; i++) {
      const distance = sorted[i]! - location
      if (distance > cut) {
        pull += cut
        square += cut * cut
      } else if (distance < -cut) {
        pull -= cut
        square += cut * cut
      } else {
        pull += distance
        square += distance * distance
        inside++
      }
    }
    if (Math.abs(pull) <= 1e-12 * scale * count) break
    if (pull > 0) low = location
    else high = location
    const newton = inside > 0 ? location + pull / inside : NaN
    location = newton > low && newton < high ? newton : (low + high) / 2
  }
  return { location, standardError: inside > 0 ? Math.sqrt(square) / inside : NaN }
}

/** Median of |value - middle|, by walking outwards from the middle of sorted values. */
function medianDistance(sorted: Float64Array, from: number, to: number, middle: number): number {
  const count = to - from
  let right = from
  while (right < to && sorted[right]! < middle) right++
  let left = right - 1
  const lower = (count - 1) >> 1
  const upper = count >> 1
  let sum = 0
  for (let rank = 0; rank <= upper; rank++) {
    const below = left >= from ? middle - sorted[left]! : Infinity
    const above = right < to ? sorted[right]! - middle : Infinity
    const distance = Math.min(below, above)
    if (below <= above) left--
    else right++
    if (rank === lower) sum += distance
    if (rank === upper) sum += distance
  }
  return sum / 2
}
