import fc from 'fast-check'
import { median } from 'simple-statistics'
import { expect, test } from 'vitest'
import { biweight, huberWeight, medianOf, quantileOf, robustSd } from '../../../src/kernel/stats/index.ts'

/** Few distinct values, so that ties are common; missing ones among them. */
const values = fc.array(
  fc.oneof(
    fc.integer({ min: -4, max: 4 }),
    fc.double({ min: -1e3, max: 1e3, noNaN: true }),
    fc.constant(NaN),
  ),
  { maxLength: 40 },
)
const known = (list: readonly number[]): number[] => list.filter((value) => !Number.isNaN(value))

test('quantiles run straight between order statistics (type 7), by hand', () => {
  // Hyndman & Fan (1996), definition 7: at (n - 1) q. For 1 2 4 8: 0.5 -> 3, 0.25 -> 1 + 0.75, 0.9 -> 4 + 0.7 x 4.
  const list = [8, 1, NaN, 4, 2]
  expect(quantileOf(list, 0.5)).toBe(3)
  expect(quantileOf(list, 0.25)).toBe(1.75)
  expect(quantileOf(list, 0.9)).toBeCloseTo(6.8, 12)
  expect(quantileOf(list, 0)).toBe(1)
  expect(quantileOf(list, 1)).toBe(8)
  expect(quantileOf([5], 0.37)).toBe(5)
  expect(quantileOf([NaN], 0.5)).toBeNaN()
  expect(medianOf([])).toBeNaN()
})

test('the median is that of simple-statistics, missing values left out', () => {
  fc.assert(
    fc.property(values, (list) => {
      const left = known(list)
      if (left.length === 0) expect(medianOf(list)).toBeNaN()
      else expect(medianOf(list)).toBeCloseTo(median(left), 9)
    }),
  )
})

test('a quantile is in order with its share and inside the values', () => {
  fc.assert(
    fc.property(
      values,
      fc.double({ min: 0, max: 1, noNaN: true }),
      fc.double({ min: 0, max: 1, noNaN: true }),
      (list, a, b) => {
        fc.pre(known(list).length > 0)
        const [low, high] = [quantileOf(list, Math.min(a, b)), quantileOf(list, Math.max(a, b))]
        expect(low).toBeLessThanOrEqual(high + 1e-9)
        expect(low).toBeGreaterThanOrEqual(Math.min(...known(list)) - 1e-9)
        const sorted = known(list).sort((x, y) => x - y)
        // At an order statistic's own place the quantile is that value.
        const k = Math.round(a * (sorted.length - 1))
        if (sorted.length > 1) expect(quantileOf(list, k / (sorted.length - 1))).toBeCloseTo(sorted[k]!, 6)
      },
    ),
  )
})

test('the robust SD is 1.4826 times the median absolute deviation, whatever ties and gaps', () => {
  // 1 / Phi^-1(0.75): 1 / 0.6744897501960817 (standard table of the normal distribution: 0.6745).
  fc.assert(
    fc.property(values, (list) => {
      const left = known(list)
      if (left.length === 0) {
        expect(robustSd(list)).toBeNaN()
        return
      }
      const centre = median(left)
      const naive = median(left.map((value) => Math.abs(value - centre))) / 0.6744897501960817
      expect(Math.abs(robustSd(list) - naive)).toBeLessThan(1e-9 * (1 + naive))
    }),
    { numRuns: 1000 },
  )
})

test('the robust SD by hand: even, odd, mostly ties, one value', () => {
  expect(robustSd([1, 2, 3, 4, 100])).toBeCloseTo(1.4826022185056018, 12) // deviations 2 1 0 1 97
  expect(robustSd([1, 2, 3, 4])).toBeCloseTo(1.4826022185056018, 12) // deviations 1.5 0.5 0.5 1.5
  expect(robustSd([5, 5, 5, 9])).toBe(0)
  expect(robustSd([7])).toBe(0)
  const input = Float64Array.from([3, 1, 2])
  robustSd(input)
  expect([...input]).toEqual([3, 1, 2])
})

test("Huber's weight is 1 up to its cut and falls as cut over size", () => {
  for (const z of [0, 1, -1.345, 1.345]) expect(huberWeight(z)).toBe(1)
  expect(huberWeight(2.69)).toBeCloseTo(0.5, 12)
  expect(huberWeight(-13.45)).toBeCloseTo(0.1, 12)
  expect(huberWeight(4, 2)).toBe(0.5)
})

test('the biweight falls smoothly to 0 at its cut', () => {
  expect(biweight(0)).toBe(1)
  expect(biweight(4.685)).toBe(0)
  expect(biweight(-5)).toBe(0)
  expect(biweight(4.685 / 2)).toBeCloseTo(0.5625, 12) // (1 - 1/4)^2
  expect(biweight(-1, 2)).toBeCloseTo(0.5625, 12)
})
