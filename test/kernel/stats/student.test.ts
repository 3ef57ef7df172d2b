import { expect, test } from 'vitest'
import { studentQuantile } from '../../../src/kernel/stats/index.ts'

test("quantiles are those of the printed table of Student's t", () => {
  // Two-sided 5 % column of the standard printed table (Fisher & Yates, Statistical Tables, distribution of t), three decimals;
  // one and two degrees are confirmed by their closed forms below.
  const TABLE = [
    [1, 12.706],
    [2, 4.303],
    [5, 2.571],
    [10, 2.228],
    [29, 2.045],
  ] as const
  for (const [degrees, value] of TABLE) {
    expect(Math.abs(studentQuantile(0.975, degrees) - value), `${degrees} degrees`).toBeLessThan(5.1e-4)
    expect(Math.abs(studentQuantile(0.025, degrees) + value), `${degrees} degrees`).toBeLessThan(5.1e-4)
  }
})

test('one degree is the Cauchy, two degrees have a closed form, many are the normal', () => {
  // t = tan(pi (q - 1/2)), and t = (2 q - 1) sqrt(2 / (1 - (2 q - 1)^2)), by integrating the density. jstat is right to 1e-7.
  for (const q of [0.6, 0.9, 0.975, 0.995]) {
    const cauchy = Math.tan(Math.PI * (q - 0.5))
    const two = (2 * q - 1) * Math.sqrt(2 / (1 - (2 * q - 1) ** 2))
    expect(Math.abs(studentQuantile(q, 1) / cauchy - 1)).toBeLessThan(1e-6)
    expect(Math.abs(studentQuantile(q, 2) / two - 1)).toBeLessThan(1e-6)
  }
  expect(Math.abs(studentQuantile(0.975, 1e7) - 1.959963984540054)).toBeLessThan(1e-5)
  expect(studentQuantile(0.5, 7)).toBeCloseTo(0, 9)
})

test('degrees of freedom may be broken, as blocks of days are', () => {
  for (const degrees of [1.5, 6.5, 14.25]) {
    const value = studentQuantile(0.975, degrees)
    expect(value).toBeLessThan(studentQuantile(0.975, Math.floor(degrees)))
    expect(value).toBeGreaterThan(studentQuantile(0.975, Math.ceil(degrees)))
  }
})

test('outside its ranges there is no quantile', () => {
  for (const [q, degrees] of [
    [0, 5],
    [1, 5],
    [NaN, 5],
    [0.9, 0],
    [0.9, -1],
    [0.9, NaN],
  ] as const) {
    expect(studentQuantile(q, degrees)).toBeNaN()
  }
})
