import { expect, test } from 'vitest'
import { normalProbability } from '../../../src/kernel/stats/index.ts'

test('the probability below z is that of printed tables', () => {
  // Standard normal table: 0.5, 0.841345, 0.975002, 0.998650; the other side by symmetry.
  for (const [z, below] of [
    [0, 0.5],
    [1, 0.841345],
    [1.96, 0.975002],
    [3, 0.99865],
  ] as const) {
    expect(Math.abs(normalProbability(z) - below), `z ${z}`).toBeLessThan(6e-7)
    expect(Math.abs(normalProbability(-z) - (1 - below)), `z ${-z}`).toBeLessThan(6e-7)
  }
  expect(normalProbability(Infinity)).toBe(1)
  expect(normalProbability(-Infinity)).toBe(0)
  expect(normalProbability(NaN)).toBe(NaN)
})
