/**
 * The same direction in [-180, 180) degrees; half a turn gives -180. Never -0. NaN and infinities give NaN.
 *
 * @example wrap180(180) // -180
 * @example wrap180(-181) // 179
 */
export function wrap180(angleDeg: number): number {
  if (angleDeg >= -180 && angleDeg < 180) return angleDeg + 0 // -0 becomes 0
  const rest = angleDeg % 360 // exact, with the sign of the angle
  if (rest >= 180) return rest - 360
  return (rest < -180 ? rest + 360 : rest) + 0
}

/**
 * The same direction in [0, 360) degrees. Never 360: an angle less than one rounding step below a whole turn gives 0.
 * Never -0. NaN and infinities give NaN.
 *
 * @example wrap360(-90) // 270
 * @example wrap360(-1e-15) // 0
 */
export function wrap360(angleDeg: number): number {
  if (angleDeg >= 0 && angleDeg < 360) return angleDeg + 0
  const rest = angleDeg % 360
  const turned = rest < 0 ? rest + 360 : rest
  return turned >= 360 ? 0 : turned + 0 // -1e-15 + 360 rounds to 360
}

/**
 * How far a stands clockwise of b, degrees in [-180, 180); half a turn gives -180. NaN when either is missing.
 *
 * @example signedDifference(5, 355) // 10
 */
export function signedDifference(aDeg: number, bDeg: number): number {
  return wrap180(aDeg - bDeg)
}
