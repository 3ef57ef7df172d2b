import fc from 'fast-check'
import { expect, test } from 'vitest'
import { exponentDoubt, withExponentDoubt } from '../../../src/analysis/offset/exponent-doubt.ts'
import { furtherDays } from '../../../src/analysis/offset/further-days.ts'
import { SETTINGS } from '../../frame/settings.ts'
import { normals } from '../../kernel/stats/normals.ts'

const FIELD = { given: 3, low: 1.4, high: 3 }
/** Ends are found to 1e-3 degrees. */
const PRECISION = 2e-3

test('the range holds the exponent in force, whatever it is', () => {
  expect(exponentDoubt(SETTINGS)).toEqual(FIELD)
  expect(exponentDoubt({ ...SETTINGS, exponent: 1.2 })).toEqual({ given: 1.2, low: 1.2, high: 3 })
  expect(exponentDoubt({ ...SETTINGS, exponent: 4 })).toEqual({ given: 4, low: 1.4, high: 4 })
})

test('an exponent that is known leaves the interval as it is', () => {
  const known = withExponentDoubt(5, 2, { given: 3, low: 3, high: 3 })
  expect(known).toEqual({ interval: [3, 7], endExponents: [3, 3], part: 0 })
})

test('a range that ends at the given exponent moves an end only away from 0, and no further than its low end', () => {
  fc.assert(
    fc.property(
      fc.double({ min: -20, max: 20, noNaN: true }),
      fc.double({ min: 0.01, max: 12, noNaN: true }),
      (m, half) => {
        const { interval, part } = withExponentDoubt(m, half, FIELD)
        const most = FIELD.given / FIELD.low
        for (const [known, end, outward] of [
          [m - half, interval[0], -1],
          [m + half, interval[1], 1],
        ] as const) {
          const grown = outward * (end - known)
          expect(grown).toBeGreaterThanOrEqual(-1e-9)
          if (known * outward <= 0) expect(grown).toBeLessThan(PRECISION)
          expect(Math.abs(end)).toBeLessThanOrEqual(Math.max(Math.abs(known), Math.abs(known) * most) + 1e-9)
        }
        expect(part).toBeGreaterThanOrEqual(0)
        const mirrored = withExponentDoubt(-m, half, FIELD).interval
        expect(mirrored[0]).toBeCloseTo(-interval[1], 9)
      },
    ),
  )
})

test('the interval holds the truth as often when the true exponent is 2 as when it is the given one', () => {
  // What is read is p / 3 of the truth, with a normal error of 1 degree. 2100 draws know a share of 95 % to 0.5 %.
  const draw = normals(5)
  for (const [exponent, least] of [
    [3, 0.95],
    [2, 0.93],
  ] as const) {
    let held = 0
    let given = 0
    for (let k = 0; k < 2100; k++) {
      const truth = (k % 21) - 10
      const read = (truth * exponent) / 3 + draw()
      const [low, high] = withExponentDoubt(read, 1.96, FIELD).interval
      if (low <= truth && truth <= high) held++
      if (Math.abs(read - truth) <= 1.96) given++
    }
    expect(held / 2100, `p ${exponent}`).toBeGreaterThan(least)
    if (exponent === 2) expect(given / 2100).toBeLessThan(0.7)
  }
})

test('numbers that are not known give none', () => {
  expect(withExponentDoubt(NaN, 1, FIELD).interval).toEqual([NaN, NaN])
  expect(withExponentDoubt(1, NaN, FIELD).interval).toEqual([NaN, NaN])
})

test('further days are those after which the verdict would be given, exponent included', () => {
  const question = { thresholdDeg: 3, doubt: FIELD }
  const half = { shrinking: 3, fixed: 0.5 }
  const { days, note } = furtherDays(0.3, half, 20, question)
  expect(note).toContain(`${days!} more days`)
  const at = (total: number): number => Math.hypot(half.shrinking * Math.sqrt(20 / total), half.fixed)
  const far = (total: number): number => withExponentDoubt(0.3, at(total), FIELD).interval[1]
  expect(far(20 + days!)).toBeLessThan(3)
  expect(far(20 + days! - 1)).toBeGreaterThanOrEqual(3)
})

test('what the exponent alone leaves open no days will settle, and that is said with both numbers', () => {
  // At 3 it reads 2 and is inside; at 1.4 it is 4.3 and is not.
  const { days, note } = furtherDays(2, { shrinking: 1, fixed: 0 }, 30, { thresholdDeg: 3, doubt: FIELD })
  expect(days).toBeNull()
  expect(note).toMatch(
    /more days will not settle it.*at the exponent 3 m is 2\.0, at 1\.4 it would be 4\.3.*reference/,
  )
})
