import fc from 'fast-check'
import { expect, test } from 'vitest'
import { circularMean, circularQuantiles } from '../../../src/kernel/angle/index.ts'
import { gapDeg } from './gap-deg.ts'
import { REFERENCE_SETS } from './reference-sets.ts'

const PROBABILITIES = [0, 0.05, 0.25, 0.5, 0.75, 0.95, 1]
/** Within a half circle, so that rounding cannot carry an angle over the cut. */
const arc = fc
  .tuple(
    fc.double({ min: -720, max: 720, noNaN: true }),
    fc.array(fc.double({ min: -85, max: 85, noNaN: true }), { minLength: 1, maxLength: 40 }),
  )
  .map(([centre, offsets]) => offsets.map((offset) => centre + offset))

test.each(REFERENCE_SETS)('$name: quantiles as in R', ({ angles, quantilesR }) => {
  const quantiles = circularQuantiles(angles, [0.05, 0.25, 0.5, 0.75, 0.95])
  quantiles.forEach((quantile, i) => {
    expect(gapDeg(quantile, quantilesR[i]!)).toBeLessThan(1e-9)
    expect(quantile >= -180 && quantile < 180).toBe(true)
  })
})

test('quantiles lie between the order statistics about the mean', () => {
  // By hand, type 7: rank p (n - 1) from 0.
  expect(Array.from(circularQuantiles([350, 0, 10], [0, 0.5, 0.75, 1]))).toEqual([-10, 0, 5, 10])
  const aboutSouth = circularQuantiles([170, 180, 190, 200], [0.5])[0]!
  expect(gapDeg(aboutSouth, 185)).toBeLessThan(1e-12)
  expect(aboutSouth).toBeLessThan(0)
})

test('nothing known, or no mean to measure from, gives no quantile', () => {
  expect(Array.from(circularQuantiles([], [0.5, 0.9]))).toEqual([NaN, NaN])
  expect(Array.from(circularQuantiles([NaN], [0.5]))).toEqual([NaN])
  expect(Array.from(circularQuantiles([0, 180], [0.5]))).toEqual([NaN])
  expect(circularQuantiles([1, 2], []).length).toBe(0)
})

test('a probability outside 0 to 1 is refused, even without data', () => {
  for (const probability of [-0.01, 1.01, NaN]) {
    expect(() => circularQuantiles([], [probability])).toThrow(
      expect.objectContaining({ code: 'OUT_OF_RANGE' }),
    )
  }
})

test('turning every angle turns the quantiles; order, missing values and whole turns do not', () => {
  fc.assert(
    fc.property(arc, fc.double({ min: -720, max: 720, noNaN: true }), (data, turn) => {
      const quantiles = circularQuantiles(data, PROBABILITIES)
      const variants: [number, number[]][] = [
        [turn, data.map((angle) => angle + turn)],
        [0, data.toReversed()],
        [0, data.flatMap((angle) => [NaN, angle])],
        [0, data.map((angle) => angle - 720)],
      ]
      for (const [by, variant] of variants) {
        circularQuantiles(variant, PROBABILITIES).forEach((quantile, i) => {
          expect(gapDeg(quantile, quantiles[i]! + by)).toBeLessThan(1e-9)
          expect(quantile >= -180 && quantile < 180).toBe(true)
        })
      }
    }),
  )
})

test('quantiles rise with their probability, seen from the mean', () => {
  fc.assert(
    fc.property(arc, (data) => {
      const { direction } = circularMean(data)
      const fromMean = Array.from(circularQuantiles(data, PROBABILITIES)).map(
        (quantile) => ((((quantile - direction + 180) % 360) + 360) % 360) - 180,
      )
      for (let i = 1; i < fromMean.length; i++) {
        expect(fromMean[i]!).toBeGreaterThanOrEqual(fromMean[i - 1]! - 1e-9)
      }
    }),
  )
})
