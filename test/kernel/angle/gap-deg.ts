/** Distance between two directions, degrees, 0 to 180; NaN stays NaN, so that a comparison with it fails. */
export function gapDeg(aDeg: number, bDeg: number): number {
  return Math.abs(((((aDeg - bDeg) % 360) + 540) % 360) - 180)
}
