/** Lags at which the autocorrelation is fitted, in intervals. */
const LAGS = [1, 2, 3, 4, 6] as const
/** Pairs below which a lag says nothing. */
const MIN_PAIRS = 60

/**
 * Noise with memory: a slow part that forgets exponentially, and a part that is new in every row.
 * Autocorrelation at a distance of k intervals: share x persistence^k.
 */
export interface SerialNoise {
  /** Share of the variance that persists, 0 to 1. */
  readonly share: number
  /** What is left of the slow part after one interval, 0 to 1. */
  readonly persistence: number
}

/** Where the rows stand in time: `position` rises by 1 an interval, gaps included; a chain ends where `chain` changes. */
export interface RowPlaces {
  readonly position: ArrayLike<number>
  readonly chain: ArrayLike<number>
}

/**
 * Share and persistence of serial noise from residuals with gaps, by the autocorrelation at a few lags.
 *
 * @param residual  length n, mean near 0, equal variance; clipped by the caller where outliers must not matter.
 * @returns share 0 (plain white noise) when there are too few pairs or no positive autocorrelation at the first lag.
 */
export function serialNoise(residual: Float64Array, places: RowPlaces): SerialNoise {
  const n = residual.length
  let variance = 0
  for (const value of residual) variance += value * value
  variance /= n
  if (!(variance > 0)) return { share: 0, persistence: 0 }
  const known = LAGS.map((lag) => ({ lag, ...autocorrelation(residual, places, lag, variance) })).filter(
    ({ pairs }) => pairs >= MIN_PAIRS,
  )
  const first = known[0]
  if (!first || first.lag !== 1 || !(first.value > 2 / Math.sqrt(first.pairs)))
    return { share: 0, persistence: 0 }

  let best: SerialNoise = { share: Math.min(0.95, first.value), persistence: 0.5 }
  let least = Infinity
  for (let step = 0; step < 20; step++) {
    const persistence = 0.02 + 0.05 * step
    let top = 0
    let bottom = 0
    for (const { lag, value, pairs } of known) {
      const shape = persistence ** lag
      top += pairs * shape * value
      bottom += pairs * shape * shape
    }
    const share = Math.min(0.98, Math.max(0, top / bottom))
    let squares = 0
    for (const { lag, value, pairs } of known) squares += pairs * (value - share * persistence ** lag) ** 2
    if (squares < least) {
      least = squares
      best = { share, persistence }
    }
  }
  return best
}

function autocorrelation(
  residual: Float64Array,
  places: RowPlaces,
  lag: number,
  variance: number,
): { value: number; pairs: number } {
  let sum = 0
  let pairs = 0
  let back = 0
  for (let i = 0; i < residual.length; i++) {
    while (places.position[back]! < places.position[i]! - lag) back++
    if (places.position[back] === places.position[i]! - lag && places.chain[back] === places.chain[i]) {
      sum += residual[i]! * residual[back]!
      pairs++
    }
  }
  return { value: pairs > 0 ? sum / pairs / variance : 0, pairs }
}

/**
 * Takes out of each value what the rows before it in its chain foretell under the given noise, and scales the rest to
 * the variance of the noise: least squares on such values is generalised least squares on the original ones.
 *
 * @param series  one or more series over the same rows, each of length n; all go through the same filter.
 * @returns new arrays.
 * @source Kalman filter of an autoregressive state with observation noise; Harvey (1989), Forecasting, Structural Time Series Models and
 *   the Kalman Filter, section 3.4 (generalised least squares).
 */
export function whiten(
  series: readonly Float64Array[],
  places: RowPlaces,
  noise: SerialNoise,
): Float64Array[] {
  const out = series.map((values) => values.slice())
  if (!(noise.share > 0)) return out
  const state = new Float64Array(series.length)
  let variance = noise.share
  for (let i = 0; i < (series[0]?.length ?? 0); i++) {
    if (i === 0 || places.chain[i] !== places.chain[i - 1]) {
      state.fill(0)
      variance = noise.share
    } else {
      const kept = noise.persistence ** (places.position[i]! - places.position[i - 1]!)
      for (let s = 0; s < state.length; s++) state[s]! *= kept
      variance = kept * kept * variance + noise.share * (1 - kept * kept)
    }
    const total = variance + (1 - noise.share)
    const gain = variance / total
    const scale = 1 / Math.sqrt(total)
    for (let s = 0; s < state.length; s++) {
      const innovation = series[s]![i]! - state[s]!
      state[s]! += gain * innovation
      out[s]![i] = innovation * scale
    }
    variance *= 1 - gain
  }
  return out
}
