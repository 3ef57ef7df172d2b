import { expect, test } from 'vitest'
import { chiSquareUpperTail } from '../../../src/kernel/stats/index.ts'

test('with two degrees of freedom the upper tail is exp(-x / 2)', () => {
  // By hand: chi-square with 2 degrees of freedom is exponential with mean 2.
  for (const value of [0, 0.5, 3, 9.21, 40]) {
    expect(chiSquareUpperTail(value, 2)).toBeCloseTo(Math.exp(-value / 2), 12)
  }
})

test('with one degree of freedom it is twice the normal tail', () => {
  // The square of the normal quantile at 97.5 %, 1.959963984540054, is exceeded with a chance of 5 %.
  expect(chiSquareUpperTail(1.959963984540054 ** 2, 1)).toBeCloseTo(0.05, 9)
})

test('no degrees of freedom, a negative or a missing value give NaN', () => {
  for (const [value, freedom] of [
    [1, 0],
    [-1, 2],
    [NaN, 2],
    [1, NaN],
  ] as const)
    expect(chiSquareUpperTail(value, freedom)).toBe(NaN)
})
