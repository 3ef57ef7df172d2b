import { expect, test } from 'vitest'
import { trendLine } from '../../../src/analysis/index.ts'

const MONTH_MS = (365.2425 * 86_400_000) / 12
const series = (values: readonly number[], halfWidth: number) =>
  values.map((value, k) => ({ atMs: k * MONTH_MS, value, halfWidth }))

test('half a degree a month is 6 degrees a year, and beyond chance when each month is known to half a degree', () => {
  const line = trendLine('m', series([0, 0.5, 1, 1.5], 0.5))!
  expect(line.perYear).toBeCloseTo(6, 9)
  // By hand: sum of (x - mean)^2 = 5 / 144 years^2; half-width = 0.5 / sqrt(5 / 144).
  expect(line.interval95[1]! - line.perYear!).toBeCloseTo(0.5 / Math.sqrt(5 / 144), 9)
  expect(line.beyondChance).toBe(true)
  expect(line.lastChange).toBeCloseTo(0.5, 12)
  expect(line.lastBeyondChance).toBe(false)
})

test('a last step counts where it exceeds the combined error of its two windows: 0.5 x sqrt(2) = 0.707', () => {
  expect(trendLine('m', series([1, 1.7], 0.5))!.lastBeyondChance).toBe(false)
  expect(trendLine('m', series([1, 1.72], 0.5))!.lastBeyondChance).toBe(true)
})

test('without errors three windows on a line are no proof by themselves, and scatter hides a slope', () => {
  const line = trendLine('moves', series([10, 14, 9, 13, 10], NaN))!
  expect(line.beyondChance).toBe(false)
  expect(line.lastChange95).toEqual([null, null])
  expect(line.lastBeyondChance).toBe(false)
})

test('one window has no trend; missing ones are passed over', () => {
  expect(trendLine('m', series([1], 1))).toBeNull()
  expect(trendLine('m', series([1, NaN, 3], 1))).toMatchObject({ windows: 2, perYear: null, lastChange: 2 })
})
