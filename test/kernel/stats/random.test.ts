import fc from 'fast-check'
import { expect, test } from 'vitest'
import { createRandom } from '../../../src/kernel/stats/index.ts'

const MASK = 0xffffffffn

/**
 * xoshiro128** as printed in Blackman & Vigna (2021), Scrambled linear pseudorandom number generators, ACM TOMS 47(4), in whole
 * numbers without bound, so that no 32-bit trick of the code under test is repeated here. The seeding is splitmix32: the
 * finaliser of MurmurHash3 over a Weyl sequence.
 */
function published(seed: number, stream: number, count: number): number[] {
  const rotate = (x: bigint, k: bigint): bigint => ((x << k) | (x >> (32n - k))) & MASK
  let weyl = (BigInt(seed) ^ ((BigInt(stream) * 0x9e3779b9n) & MASK)) & MASK
  const seeded = (): bigint => {
    weyl = (weyl + 0x9e3779b9n) & MASK
    let z = weyl
    z = ((z ^ (z >> 16n)) * 0x85ebca6bn) & MASK
    z = ((z ^ (z >> 13n)) * 0xc2b2ae35n) & MASK
    return z ^ (z >> 16n)
  }
  const s = [seeded(), seeded(), seeded(), seeded()] as [bigint, bigint, bigint, bigint]
  const out: number[] = []
  for (let i = 0; i < count; i++) {
    out.push(Number((rotate((s[1] * 5n) & MASK, 7n) * 9n) & MASK))
    const t = (s[1] << 9n) & MASK
    s[2] ^= s[0]
    s[3] ^= s[1]
    s[1] ^= s[2]
    s[0] ^= s[3]
    s[2] ^= t
    s[3] = rotate(s[3], 11n)
  }
  return out
}

test('the numbers are those of the published algorithm', () => {
  for (const [seed, stream] of [
    [0, 0],
    [1, 0],
    [1, 4],
    [20260301, 2],
    [4294967295, 4294967295],
  ] as const) {
    const random = createRandom(seed, stream)
    const drawn = Array.from({ length: 200 }, () => random.uint32())
    expect(drawn, `seed ${seed} stream ${stream}`).toEqual(published(seed, stream, 200))
  }
})

test('below(n) stays in range, whatever n', () => {
  fc.assert(
    fc.property(fc.integer({ min: 1, max: 2 ** 32 }), fc.integer({ min: 0, max: 2 ** 32 - 1 }), (n, seed) => {
      const random = createRandom(seed)
      for (let i = 0; i < 20; i++) {
        const drawn = random.below(n)
        expect(Number.isInteger(drawn) && drawn >= 0 && drawn < n).toBe(true)
      }
    }),
  )
})

test('below(n) is uniform also where 2^32 is no multiple of n', () => {
  // 3 x 2^30: taking the remainder alone would draw the lowest third twice as often as the others.
  const n = 3 * 2 ** 30
  const random = createRandom(7)
  const draws = 30_000
  const thirds = [0, 0, 0]
  for (let i = 0; i < draws; i++) thirds[Math.floor(random.below(n) / 2 ** 30)]!++
  // SD of a binomial count is sqrt(draws x 1/3 x 2/3) = 82; five of them. The biased draw would be off by 5000.
  for (const count of thirds) expect(Math.abs(count - draws / 3)).toBeLessThan(5 * 82)

  const faces = new Array<number>(31).fill(0)
  for (let i = 0; i < 31_000; i++) faces[random.below(31)]!++
  const chiSquare = faces.reduce((sum, count) => sum + (count - 1000) ** 2 / 1000, 0)
  expect(chiSquare).toBeLessThan(59.7) // 99.9 % point of chi-square with 30 degrees of freedom, standard table
})

test('streams and seeds do not resemble each other', () => {
  const first = (seed: number, stream: number): string => {
    const random = createRandom(seed, stream)
    return Array.from({ length: 4 }, () => random.uint32()).join(' ')
  }
  const all = new Set<string>()
  for (let seed = 0; seed < 50; seed++)
    for (let stream = 0; stream < 5; stream++) all.add(first(seed, stream))
  expect(all.size).toBe(250)
})
