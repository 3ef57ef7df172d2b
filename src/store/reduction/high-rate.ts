/** Length of the interval that high-rate rows are scored in, s. */
export const REDUCED_INTERVAL_S = 600

/** At most this makes some ten rows of an interval: whether they divide it is no matter then, s. */
const FINE_INTERVAL_S = 60

/**
 * Whether rows of this interval are reduced to 10-minute statistics before they are scored: two or more of them make an
 * interval, and its edges fall between rows, or there are so many that it does not matter.
 *
 * @param intervalS  s; null or NaN = not known: not reduced.
 */
export function isHighRate(intervalS: number | null): boolean {
  if (intervalS === null || !(intervalS > 0)) return false
  if (intervalS <= FINE_INTERVAL_S) return true
  return (
    intervalS <= REDUCED_INTERVAL_S / 2 && (REDUCED_INTERVAL_S * 1000) % Math.round(intervalS * 1000) === 0
  )
}

/** Start of the interval that a row belongs to, epoch ms, as SQL; also right before 1970. */
export const BIN_SQL = (() => {
  const ms = REDUCED_INTERVAL_S * 1000
  return `(time - ((time % ${ms}) + ${ms}) % ${ms})`
})()
