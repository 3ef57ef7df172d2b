import { expect, test } from 'vitest'
import {
  rayleighCumulative,
  weibullCumulative,
  weibullScale,
  weibullShapeFrom,
} from '../../../src/kernel/wind/index.ts'

test('Rayleigh shares are those of the closed form', () => {
  // Reference run (numpy) of 1 - exp(-(pi/4)(V/Vave)^2).
  for (const [mean, speed, expected] of [
    [7.5, 3, 0.11808862170182366],
    [7.5, 5, 0.29465331861967536],
    [7.5, 7.5, 0.5440618722340038],
    [7.5, 10, 0.7524798785760844],
    [7.5, 15, 0.9567861],
    [7.5, 25, 0.9998377944597517],
    [4, 3, 0.35711310157482656],
    [11, 25, 0.9826958460785634],
  ] as const) {
    expect(Math.abs(rayleighCumulative(speed, mean) - expected)).toBeLessThan(3e-8)
  }
  expect(rayleighCumulative(-2, 7)).toBe(0)
  expect(rayleighCumulative(0, 7)).toBe(0)
  expect(rayleighCumulative(NaN, 7)).toBeNaN()
})

test('a Rayleigh distribution has its mean, and 6/pi of its cube as mean cube', () => {
  // Moments by integration: E v = integral of (1 - F), E v^3 = integral of 3 v^2 (1 - F); midpoint rule, 60 m/s.
  const mean = 7.5
  let first = 0
  let third = 0
  for (let v = 0.0005; v < 60; v += 0.001) {
    const beyond = 1 - rayleighCumulative(v, mean)
    first += beyond * 0.001
    third += 3 * v * v * beyond * 0.001
  }
  expect(first / mean).toBeCloseTo(1, 6)
  expect(third / ((6 / Math.PI) * mean ** 3)).toBeCloseTo(1, 6)
})

test('Weibull of shape 2 is Rayleigh and of shape 1 exponential', () => {
  for (const speed of [0, 2.5, 7, 14, 30]) {
    const scaleMs = (2 * 7) / Math.sqrt(Math.PI)
    expect(weibullCumulative(speed, { scaleMs, shape: 2 })).toBeCloseTo(rayleighCumulative(speed, 7), 14)
    expect(weibullCumulative(speed, { scaleMs: 5, shape: 1 })).toBeCloseTo(1 - Math.exp(-speed / 5), 14)
  }
  expect(weibullCumulative(-1, { scaleMs: 5, shape: 2.2 })).toBe(0)
})

test('a scale, shape or mean that is not above 0 is refused', () => {
  const outOfRange: unknown = expect.objectContaining({ code: 'OUT_OF_RANGE' })
  expect(() => rayleighCumulative(5, 0)).toThrow(outOfRange)
  expect(() => rayleighCumulative(5, NaN)).toThrow(outOfRange)
  expect(() => weibullCumulative(5, { scaleMs: 0, shape: 2 })).toThrow(outOfRange)
  expect(() => weibullCumulative(5, { scaleMs: 5, shape: NaN })).toThrow(outOfRange)
})

test('a Weibull scale gives the mean it was asked for, and shape 2 the Rayleigh distribution', () => {
  expect(Math.abs(weibullScale(7, 2) / ((2 * 7) / Math.sqrt(Math.PI)) - 1)).toBeLessThan(1e-8)
  expect(Math.abs(weibullScale(7, 1) / 7 - 1)).toBeLessThan(1e-8) // exponential: scale and mean are one
  for (const shape of [1.5, 2.3, 3.5]) {
    const scaleMs = weibullScale(7, shape)
    let mean = 0
    for (let v = 0.005; v < 80; v += 0.01) mean += 0.01 * (1 - weibullCumulative(v, { scaleMs, shape }))
    expect(mean).toBeCloseTo(7, 4)
  }
  expect(() => weibullScale(0, 2)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
  expect(() => weibullScale(7, NaN)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
})

test('a shape is read back from mean and spread to 1.2 percent', () => {
  // SD / mean of a Weibull distribution is sqrt(Gamma(1 + 2/k) / Gamma(1 + 1/k)^2 - 1); Rayleigh: sqrt(4/pi - 1).
  expect(Math.abs(weibullShapeFrom(7, 7 * Math.sqrt(4 / Math.PI - 1)) / 2 - 1)).toBeLessThan(0.012)
  expect(weibullShapeFrom(7, 7)).toBeCloseTo(1, 12)
  expect(weibullShapeFrom(7, 0)).toBeNaN()
  expect(weibullShapeFrom(NaN, 2)).toBeNaN()
})
