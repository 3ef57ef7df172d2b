/**
 * Tangents of a piecewise cubic through points that rises where neighbouring points rise, falls where they fall and
 * does not overshoot.
 *
 * @param xs, ys  points, xs rising; the first `count` of each are used.
 * @param tangents  filled with dy/dx at each point; one point gets 0.
 * @source Fritsch & Carlson (1980), SIAM J. Numer. Anal. 17, 238-246: three-point differences, pulled back into the
 *   circle of radius 3.
 */
export function monotoneTangents(
  xs: Float64Array,
  ys: Float64Array,
  count: number,
  tangents: Float64Array,
): void {
  if (count === 0) return
  if (count === 1) {
    tangents[0] = 0
    return
  }
  const secant = (i: number) => (ys[i + 1]! - ys[i]!) / (xs[i + 1]! - xs[i]!)
  for (let i = 1; i < count - 1; i++) {
    const left = xs[i]! - xs[i - 1]!
    const right = xs[i + 1]! - xs[i]!
    const before = secant(i - 1)
    const after = secant(i)
    tangents[i] = before * after > 0 ? (right * before + left * after) / (left + right) : 0
  }
  tangents[0] = count > 2 ? endTangent(secant(0), secant(1), xs[1]! - xs[0]!, xs[2]! - xs[1]!) : secant(0)
  tangents[count - 1] =
    count > 2
      ? endTangent(
          secant(count - 2),
          secant(count - 3),
          xs[count - 1]! - xs[count - 2]!,
          xs[count - 2]! - xs[count - 3]!,
        )
      : secant(0)
  for (let i = 0; i < count - 1; i++) {
    const slope = secant(i)
    if (slope === 0) {
      tangents[i] = 0
      tangents[i + 1] = 0
      continue
    }
    const length = Math.hypot(tangents[i]! / slope, tangents[i + 1]! / slope)
    if (length > 3) {
      tangents[i] = (tangents[i]! * 3) / length
      tangents[i + 1] = (tangents[i + 1]! * 3) / length
    }
  }
}

/** Parabola through the last three points, kept from turning against the last secant. */
function endTangent(outer: number, inner: number, outerStep: number, innerStep: number): number {
  const tangent = outer + ((outer - inner) * outerStep) / (outerStep + innerStep)
  return tangent * outer > 0 ? tangent : 0
}

/** Value at x of the cubic between points i and i + 1. */
export function hermiteValue(
  xs: Float64Array,
  ys: Float64Array,
  tangents: Float64Array,
  i: number,
  x: number,
): number {
  const x0 = xs[i]!
  const width = xs[i + 1]! - x0
  const t = (x - x0) / width
  const s = 1 - t
  return (
    s * s * ((1 + 2 * t) * ys[i]! + t * width * tangents[i]!) +
    t * t * ((3 - 2 * t) * ys[i + 1]! - s * width * tangents[i + 1]!)
  )
}
