import { sampleVariance, mean } from 'simple-statistics'
import { expect, test } from 'vitest'
import { dayWeights, type DayWeights } from '../../../src/kernel/stats/index.ts'
import { normals } from './normals.ts'

const resample = (weights: DayWeights, r: number): number[] => [
  ...weights.counts.subarray(r * weights.days, (r + 1) * weights.days),
]

test('each resample holds as many days as the window', () => {
  for (const days of [1, 2, 5, 30, 31]) {
    for (const blockDays of [1, 2, 4, 100]) {
      const weights = dayWeights({ days, blockDays, resamples: 50, seed: 3 })
      expect(weights.counts.length).toBe(days * 50)
      for (let r = 0; r < 50; r++) {
        expect(
          resample(weights, r).reduce((sum, count) => sum + count, 0),
          `${days} days in blocks of ${blockDays}`,
        ).toBe(days)
      }
    }
  }
})

test('every day is drawn once in the mean', () => {
  const days = 30
  const resamples = 4000
  for (const blockDays of [1, 2, 4]) {
    const { counts } = dayWeights({ days, blockDays, resamples, seed: 11 })
    for (let d = 0; d < days; d++) {
      let sum = 0
      for (let r = 0; r < resamples; r++) sum += counts[r * days + d]!
      // A count is nearly Poisson with variance 1, so its mean over resamples has SD 1 / sqrt(4000) = 0.016; five of them.
      expect(Math.abs(sum / resamples - 1), `day ${d}, blocks of ${blockDays}`).toBeLessThan(
        5 / Math.sqrt(resamples),
      )
    }
  }
})

test('a block is a run of consecutive days, wrapped at the end of the window', () => {
  // With one block and a half the window's counts are two runs on a circle: 4 days and 2 days.
  const weights = dayWeights({ days: 6, blockDays: 4, resamples: 300, seed: 5 })
  const seen = new Set<string>()
  for (let r = 0; r < weights.resamples; r++) {
    const counts = resample(weights, r)
    const possible = new Set<string>()
    for (let a = 0; a < 6; a++) {
      for (let b = 0; b < 6; b++) {
        const expected = [0, 0, 0, 0, 0, 0]
        for (let k = 0; k < 4; k++) expected[(a + k) % 6]!++
        for (let k = 0; k < 2; k++) expected[(b + k) % 6]!++
        possible.add(expected.join(''))
      }
    }
    expect(possible).toContain(counts.join(''))
    seen.add(counts.join(''))
  }
  expect(seen.size).toBeGreaterThan(20)
})

test('the same arguments give the same weights, another seed or block length gives others', () => {
  const options = { days: 30, blockDays: 2, resamples: 200, seed: 9 }
  const weights = dayWeights(options)
  expect(dayWeights(options)).toEqual(weights)
  expect(dayWeights({ ...options, seed: 10 }).counts).not.toEqual(weights.counts)
  expect(dayWeights({ ...options, blockDays: 4 }).counts).not.toEqual(weights.counts)
  // A longer run starts with the shorter one: weights do not depend on how many are drawn.
  expect(dayWeights({ ...options, resamples: 300 }).counts.subarray(0, 200 * 30)).toEqual(weights.counts)
})

test('the bootstrap spread of a mean of independent days is the analytic one', () => {
  const days = 40
  const resamples = 4000
  const draw = normals(1)
  const values = Array.from({ length: days }, () => draw())
  const { counts } = dayWeights({ days, blockDays: 1, resamples, seed: 2 })
  const means = Array.from({ length: resamples }, (_, r) => {
    let sum = 0
    for (let d = 0; d < days; d++) sum += counts[r * days + d]! * values[d]!
    return sum / days
  })
  // Given the values, the variance of a resampled mean is exactly the variance with divisor n, over n.
  const analytic = (sampleVariance(values) * (days - 1)) / days / days
  // A variance of 4000 near-normal draws has a relative SD of sqrt(2 / 4000) = 2.2 %; five of them.
  expect(Math.abs(sampleVariance(means) / analytic - 1)).toBeLessThan(5 * Math.sqrt(2 / resamples))
  expect(Math.abs(mean(means) - mean(values))).toBeLessThan(5 * Math.sqrt(analytic / resamples))
})

test('blocks spread a mean wider when neighbouring days are alike', () => {
  const days = 40
  const values = Array.from({ length: days }, (_, d) => (Math.floor(d / 4) % 2 === 0 ? 1 : -1)) // four alike, then four others
  const spread = (blockDays: number): number => {
    const { counts, resamples } = dayWeights({ days, blockDays, resamples: 2000, seed: 4 })
    return sampleVariance(
      Array.from({ length: resamples }, (_, r) => {
        let sum = 0
        for (let d = 0; d < days; d++) sum += counts[r * days + d]! * values[d]!
        return sum / days
      }),
    )
  }
  // Sums over blocks of two by hand: of 8 starting places 6 hold two alike and 2 cancel, so (6 x 4) / 8 / 2 = 1.5 times.
  expect(spread(2) / spread(1)).toBeGreaterThan(1.5 * 0.8)
  expect(spread(2) / spread(1)).toBeLessThan(1.5 * 1.25)
})

test('a size out of range has its error code', () => {
  const options = { days: 30, blockDays: 1, resamples: 200, seed: 1 }
  for (const wrong of [
    { days: 0 },
    { days: NaN },
    { days: 65536 },
    { blockDays: 0 },
    { blockDays: NaN },
    { blockDays: -1 },
  ]) {
    expect(() => dayWeights({ ...options, ...wrong }), JSON.stringify(wrong)).toThrow(
      expect.objectContaining({ code: 'OUT_OF_RANGE' }),
    )
  }
})
