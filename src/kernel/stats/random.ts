/** A source of random integers that depends on nothing but its seed. */
export interface RandomSource {
  /** Next unsigned 32-bit integer. */
  uint32(): number
  /** Uniform integer in [0, n), without modulo bias; n in 1 to 2^32. */
  below(n: number): number
}

/**
 * xoshiro128** seeded by splitmix32: the same numbers on every machine, because only 32-bit integer operations are used.
 *
 * @param seed    unsigned 32-bit integer.
 * @param stream  unsigned 32-bit integer; streams of one seed do not resemble each other.
 * @source Blackman & Vigna (2021), Scrambled linear pseudorandom number generators, ACM TOMS 47(4), xoshiro128**.
 */
export function createRandom(seed: number, stream = 0): RandomSource {
  const next = splitmix32((seed ^ Math.imul(stream, 0x9e3779b9)) >>> 0)
  let a = next()
  let b = next()
  let c = next()
  let d = next()
  if ((a | b | c | d) === 0) d = 1 // the all-zero state never leaves zero

  const uint32 = (): number => {
    const scrambled = Math.imul(rotateLeft(Math.imul(b, 5), 7), 9) >>> 0
    const shifted = b << 9
    c ^= a
    d ^= b
    b ^= c
    a ^= d
    c ^= shifted
    d = rotateLeft(d, 11)
    return scrambled
  }
  return {
    uint32,
    below(n) {
      const limit = 4294967296 - (4294967296 % n)
      let drawn = uint32()
      while (drawn >= limit) drawn = uint32()
      return drawn % n
    },
  }
}

function rotateLeft(x: number, bits: number): number {
  return (x << bits) | (x >>> (32 - bits))
}

function splitmix32(seed: number): () => number {
  let state = seed | 0
  return () => {
    state = (state + 0x9e3779b9) | 0
    let z = state
    z = Math.imul(z ^ (z >>> 16), 0x85ebca6b)
    z = Math.imul(z ^ (z >>> 13), 0xc2b2ae35)
    return z ^ (z >>> 16)
  }
}
