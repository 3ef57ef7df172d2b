/** Half-width of the node table: at 3.4 the outermost weight is below 1e-18. */
const OUTERMOST = 3.4
const STEP = 1 / 32
const NODES: { distance: number; weight: number }[] = []
for (let t = STEP; t <= OUTERMOST; t += STEP) {
  const inner = (Math.PI / 2) * Math.sinh(t)
  NODES.push({
    // 1 - tanh(inner), written so that nodes close to an end keep their distance from it.
    distance: 2 / (1 + Math.exp(2 * inner)),
    weight: ((Math.PI / 2) * Math.cosh(t)) / Math.cosh(inner) ** 2,
  })
}

/**
 * Integral of a function that is smooth inside an interval and may bend sharply at its ends (like t^1.4), by the
 * double-exponential rule with a fixed table of nodes.
 *
 * Right to about 1e-12 of the largest value times the length for one bump of the width of an eighteenth of the interval or more.
 *
 * @returns 0 where the interval is empty (from >= to).
 * @source Takahasi & Mori (1974), Publ. RIMS 9, 721-741.
 */
export function integrate(f: (x: number) => number, from: number, to: number): number {
  if (!(to > from)) return 0
  const half = (to - from) / 2
  let sum = (Math.PI / 2) * f(from + half)
  for (const { distance, weight } of NODES) {
    sum += weight * (f(from + half * distance) + f(to - half * distance))
  }
  return sum * STEP * half
}
