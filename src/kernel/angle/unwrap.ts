/**
 * A series of wrapped angles as one that runs on: each value is moved by whole turns until it lies within half a turn of
 * the last known value before it.
 *
 * @param anglesDeg  degrees in order of time, wrapped anyhow. Not finite = missing: stays NaN, and the next known value is
 *   set against the last known one, so a turn made inside a gap is lost.
 * @returns degrees, same length; the first known value as it came. A step of exactly half a turn counts as -180.
 * @example Array.from(unwrap([350, 10, 30])) // [350, 370, 390]
 */
export function unwrap(anglesDeg: ArrayLike<number>): Float64Array<ArrayBuffer> {
  const unwrapped = new Float64Array(anglesDeg.length)
  let last = NaN
  for (let i = 0; i < anglesDeg.length; i++) {
    const angle = anglesDeg[i]!
    if (!Number.isFinite(angle)) {
      unwrapped[i] = NaN
      continue
    }
    // Whole turns are added to the reading itself: summing the steps would gather rounding over a long series.
    if (!Number.isNaN(last)) last = angle + 360 * Math.ceil((last - angle) / 360 - 0.5)
    else last = angle
    unwrapped[i] = last
  }
  return unwrapped
}
