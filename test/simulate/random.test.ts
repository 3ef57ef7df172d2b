import { expect, test } from 'vitest'
import { RandomStream } from '../../src/simulate/random.ts'

const N = 400_000

function moments(values: Float64Array) {
  const mean = values.reduce((sum, x) => sum + x, 0) / values.length
  const centred = (power: number) => values.reduce((sum, x) => sum + (x - mean) ** power, 0) / values.length
  return { mean, variance: centred(2), skewness: centred(3), fourth: centred(4) }
}

test('normal deviates have the moments of the standard normal distribution', () => {
  const values = new Float64Array(N)
  new RandomStream(7, 3).fillNormal(values)
  const { mean, variance, skewness, fourth } = moments(values)
  // Standard errors of the sample moments of N normal deviates: 1, sqrt(2), sqrt(6), sqrt(96) over sqrt(N); five of them.
  const root = Math.sqrt(N)
  expect(Math.abs(mean)).toBeLessThan(5 / root)
  expect(Math.abs(variance - 1)).toBeLessThan((5 * Math.SQRT2) / root)
  expect(Math.abs(skewness)).toBeLessThan((5 * Math.sqrt(15)) / root)
  expect(Math.abs(fourth - 3)).toBeLessThan((5 * Math.sqrt(96)) / root)
})

test('normal deviates fall between bounds as often as the normal distribution says, tail included', () => {
  const values = new Float64Array(N)
  new RandomStream(11).fillNormal(values)
  // Two-sided probabilities of the standard normal distribution, from its printed tables; 3.4426 begins the tail's own draw.
  for (const [bound, beyond] of [
    [0.5, 0.6170751],
    [1, 0.3173105],
    [1.96, 0.0499958],
    [3, 0.0026998],
    [3.5, 0.00046526],
  ] as const) {
    const found = values.filter((x) => Math.abs(x) > bound).length
    expect(Math.abs(found - N * beyond), `beyond ${bound}`).toBeLessThan(5 * Math.sqrt(N * beyond) + 1)
  }
})

test('the same keys give the same stream, and any other key or order another one', () => {
  const first = (...keys: number[]) => new RandomStream(...keys).uniform()
  expect(first(1, 2, 3)).toBe(first(1, 2, 3))
  const others = [first(1, 2, 3), first(2, 1, 3), first(1, 2), first(1, 2, 4), first(0, 2, 3), first(1, 3, 2)]
  expect(new Set(others).size).toBe(others.length)
})

test('streams of neighbouring keys are not correlated', () => {
  const n = 50_000
  const a = new Float64Array(n),
    b = new Float64Array(n)
  new RandomStream(1, 30, 0).fillNormal(a)
  new RandomStream(1, 30, 1).fillNormal(b)
  const product = a.reduce((sum, x, i) => sum + x * b[i]!, 0) / n
  expect(Math.abs(product)).toBeLessThan(5 / Math.sqrt(n))
})
