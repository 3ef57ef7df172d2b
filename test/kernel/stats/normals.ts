/** Uniform in (0, 1), then standard normal by Box and Muller: a source apart from the one under test. */
export function normals(seed: number): () => number {
  let state = seed >>> 0
  const uniform = (): number => {
    // Numerical Recipes' 32-bit linear congruential generator: good enough for noise in a test.
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0
    return (state + 0.5) / 4294967296
  }
  return () => Math.sqrt(-2 * Math.log(uniform())) * Math.cos(2 * Math.PI * uniform())
}
