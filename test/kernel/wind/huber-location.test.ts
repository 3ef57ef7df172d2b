import fc from 'fast-check'
import { expect, test } from 'vitest'
import { huberLocation } from '../../../src/kernel/wind/huber-location.ts'

const values = fc.array(fc.double({ min: -1000, max: 1000, noNaN: true }), { minLength: 1, maxLength: 60 })

function medianOf(xs: number[]): number {
  const sorted = [...xs].sort((a, b) => a - b)
  const n = sorted.length
  return (sorted[(n - 1) >> 1]! + sorted[n >> 1]!) / 2
}

test('the location solves the estimating equation of its definition', () => {
  fc.assert(
    fc.property(values, (xs) => {
      const sorted = Float64Array.from(xs).sort()
      const { location } = huberLocation(sorted, 0, sorted.length)
      const median = medianOf(xs)
      const scale = medianOf(xs.map((x) => Math.abs(x - median))) / 0.6744897501960817
      if (!(scale > 0)) {
        expect(location).toBe(median)
        return
      }
      const cut = 1.345 * scale
      const pull = xs.reduce((sum, x) => sum + Math.max(-cut, Math.min(cut, x - location)), 0)
      // Rounding of values up to 1000 adds to the equation's own tolerance.
      expect(Math.abs(pull)).toBeLessThan(1e-9 * scale * xs.length + 1e-10)
    }),
  )
})

test('values without tails have their mean, and its standard error', () => {
  const sorted = Float64Array.from([-1, -0.9, -0.8, 0.7, 0.9, 1.4])
  const { location, standardError } = huberLocation(sorted, 0, 6)
  const mean = 0.05
  expect(location).toBeCloseTo(mean, 12)
  const squares = sorted.reduce((sum, x) => sum + (x - mean) ** 2, 0)
  expect(standardError).toBeCloseTo(Math.sqrt(squares) / 6, 12)
})

test('an outlier pulls by a bounded amount, alike from both sides', () => {
  const base = [-3, -2, -1, 0, 1, 2, 3]
  const at = (outlier: number) => huberLocation(Float64Array.from([...base, outlier]).sort(), 0, 8).location
  expect(at(1e6)).toBeCloseTo(at(100), 6)
  expect(at(100)).toBeCloseTo(-at(-100), 9)
  expect(at(100)).toBeGreaterThan(0)
  expect(at(100)).toBeLessThan(1)
})

test('only the part asked for counts, and an empty part has no location', () => {
  const sorted = Float64Array.from([-100, 1, 2, 3, 900])
  expect(huberLocation(sorted, 1, 4).location).toBe(2)
  expect(huberLocation(sorted, 2, 2).location).toBeNaN()
})

test('more than half of the values the same are the location', () => {
  expect(huberLocation(Float64Array.from([1, 5, 5, 5, 9.5]), 0, 5)).toEqual({ location: 5, standardError: 0 })
})
