import fc from 'fast-check'
import { expect, test } from 'vitest'
import {
  angularDeviation,
  angularDeviationFromResultant,
  circularDispersion,
  circularKurtosis,
  circularMoment,
  circularSd,
  circularSdFromResultant,
  circularSkewness,
  circularVariance,
  resultantLength,
} from '../../../src/kernel/angle/index.ts'
import { REFERENCE_SETS } from './reference-sets.ts'

const RAD = Math.PI / 180
const angles = fc.array(fc.double({ min: -720, max: 720, noNaN: true }), { minLength: 2, maxLength: 40 })

test.each(REFERENCE_SETS)('$name: spread and shape as in R and the closed forms', (set) => {
  const { angles: data } = set
  expect(Math.abs(circularVariance(data) - (1 - set.resultant))).toBeLessThan(1e-9)
  expect(Math.abs(circularSd(data) - set.sdDeg)).toBeLessThan(1e-9)
  expect(Math.abs(angularDeviation(data) * RAD - set.angularDeviationRad)).toBeLessThan(1e-12)
  expect(Math.abs(circularMoment(data, 2).length - set.secondLength)).toBeLessThan(1e-12)
  expect(Math.abs(circularDispersion(data) - set.dispersion)).toBeLessThan(1e-12)
  expect(Math.abs(circularSkewness(data) - set.skewness)).toBeLessThan(1e-9)
  expect(Math.abs(circularKurtosis(data) - set.kurtosis)).toBeLessThan(1e-9)
  expect(Math.abs(circularSdFromResultant(set.resultant) - set.sdDeg)).toBeLessThan(1e-9)
  const fromResultant = angularDeviationFromResultant(set.resultant) * RAD
  expect(Math.abs(fromResultant - set.angularDeviationRad)).toBeLessThan(1e-12)
})

test('books have the same spread', () => {
  // Zar (2010), ex. 26.4 and sec. 26.5: s = 34, s0 = 36 degrees.
  const trees = [45, 55, 81, 96, 110, 117, 132, 154]
  expect(Math.abs(angularDeviation(trees) - 34)).toBeLessThan(0.5)
  expect(Math.abs(circularSd(trees) - 36)).toBeLessThan(0.5)
  // Zar (2010), ex. 26.5: r = 0.55064, s = 54, s0 = 63.
  expect(Math.abs(angularDeviationFromResultant(0.55064) - 54)).toBeLessThan(0.5)
  expect(Math.abs(circularSdFromResultant(0.55064) - 63)).toBeLessThan(0.5)
  // Pewsey, Neuhaeuser & Ruxton (2013), ch. 3, on Fisher's app. B.11, to their last digit.
  const stars = REFERENCE_SETS.find(({ name }) => name === 'fisherB11')!.angles
  expect(Math.abs(circularVariance(stars) - 0.17)).toBeLessThan(0.005)
  expect(Math.abs(circularSd(stars) * RAD - 0.61)).toBeLessThan(0.005)
  expect(Math.abs(circularDispersion(stars) - 0.24)).toBeLessThan(0.005)
  expect(Math.abs(circularSkewness(stars) + 0.92)).toBeLessThan(0.005)
  expect(Math.abs(circularKurtosis(stars) - 6.64)).toBeLessThan(0.005)
  expect(Math.abs(circularMoment(stars, 2).length - 0.67)).toBeLessThan(0.005)
  expect(Math.abs(circularMoment(stars, 2).direction - 0.64)).toBeLessThan(0.005)
})

test('another library has the same variance, deviations and second moment', () => {
  // Docstrings of astropy 5.2.1: circvar, circstd (both kinds, 8 digits), circmoment.
  const data = [51, 67, 40, 109, 31, 358]
  expect(Math.abs(circularVariance(data) - 0.16356352748437508)).toBeLessThan(1e-14)
  expect(Math.abs(angularDeviation(data) * RAD - 0.57195022)).toBeLessThan(5e-9)
  expect(Math.abs(circularSd(data) * RAD - 0.59766999)).toBeLessThan(5e-9)
  const second = circularMoment(data, 2)
  expect(Math.abs(second.direction - 90.99263082432564)).toBeLessThan(1e-11)
  expect(Math.abs(second.length - 0.48004283892950717)).toBeLessThan(1e-14)
})

test('axes have a mean in their second moment', () => {
  // Zar (2010), ex. 26.7.
  const axes = [35, 40, 40, 45, 45, 55, 60, 215, 220, 225, 225, 235, 235, 240, 245]
  const { direction, length, count } = circularMoment(axes, 2)
  expect(count).toBe(15)
  expect(Math.abs(length - 0.94843)).toBeLessThan(1e-5)
  expect(Math.abs(direction - 95.9)).toBeLessThan(0.05)
  expect(Math.abs(length * 15 * Math.sin(direction * RAD) - 14.15098)).toBeLessThan(1e-5)
  expect(Math.abs(length * 15 * Math.cos(direction * RAD) + 1.46386)).toBeLessThan(1e-5)
})

test('spread of nearly equal angles keeps its digits, and equal ones have none', () => {
  // Two angles 2e-6 degrees apart: the standard deviation is half of that, far below the root of the rounding of R.
  const pair = [90 - 1e-6, 90 + 1e-6]
  expect(Math.abs(circularSd(pair) / 1e-6 - 1)).toBeLessThan(1e-6)
  expect(Math.abs(angularDeviation(pair) / 1e-6 - 1)).toBeLessThan(1e-6)
  expect(Math.abs(circularDispersion(pair) / (1e-6 * RAD) ** 2 - 1)).toBeLessThan(1e-6)
  expect(circularSd([33.3, 33.3, 33.3])).toBeLessThan(1e-12)
  expect(circularSkewness([33.3, 33.3, 33.3])).toBeNaN()
  expect(circularKurtosis([33.3, 33.3, 33.3])).toBeNaN()
})

test('for angles close together shape goes over into that of the line', () => {
  // By hand: d = -1, -1, 2 times a small angle t has V = t^2, mean d^3 = 2 t^3, mean d^4 = 6 t^4; h is about d^2 / 4, so
  // skewness -4 mean(h d) / V^1.5 = -2, kurtosis 8 mean(h^2) / V^2 - 6 = -3. Relative error of order t^2 = 3e-8.
  const tight = [99.99, 99.99, 100.02]
  expect(Math.abs(circularSkewness(tight) + 2)).toBeLessThan(1e-6)
  expect(Math.abs(circularKurtosis(tight) + 3)).toBeLessThan(1e-6)
})

test('a tail clockwise of the mean gives a negative skewness', () => {
  expect(circularSkewness([0, 1, 2, 3, 60])).toBeLessThan(-1)
  expect(circularSkewness([0, -1, -2, -3, -60])).toBeGreaterThan(1)
})

test('angles that cancel: full variance, no end to the standard deviation, no shape', () => {
  const data = [0, 90, 180, 270]
  expect(circularVariance(data)).toBeCloseTo(1, 12)
  expect(circularSd(data)).toBe(Infinity)
  expect(Math.abs(angularDeviation(data) - 81.02846845413954)).toBeLessThan(1e-9) // sqrt(2) rad
  expect(circularDispersion(data)).toBeNaN()
  expect(circularSkewness(data)).toBeNaN()
  expect(circularKurtosis(data)).toBeNaN()
  expect(circularMoment(data, 1).direction).toBeNaN()
})

test('nothing known gives nothing', () => {
  for (const f of [
    circularVariance,
    circularSd,
    angularDeviation,
    circularDispersion,
    circularSkewness,
    circularKurtosis,
  ]) {
    expect(f([]), f.name).toBeNaN()
    expect(f([NaN, NaN]), f.name).toBeNaN()
  }
  expect(circularMoment([], 2)).toEqual({ direction: NaN, length: NaN, count: 0 })
  expect(circularSdFromResultant(NaN)).toBeNaN()
  expect(angularDeviationFromResultant(NaN)).toBeNaN()
})

test('a resultant length at the ends of its range, and outside', () => {
  expect(circularSdFromResultant(0)).toBe(Infinity)
  expect(circularSdFromResultant(1 + 1e-15)).toBe(0)
  expect(angularDeviationFromResultant(1 + 1e-15)).toBe(0)
  for (const f of [circularSdFromResultant, angularDeviationFromResultant]) {
    expect(() => f(-0.1), f.name).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
  }
  for (const order of [0, 1.5, -1, NaN]) {
    expect(() => circularMoment([1], order)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
  }
})

test('spread does not change with turning, order or missing values, and follows from the resultant', () => {
  fc.assert(
    fc.property(angles, fc.double({ min: -720, max: 720, noNaN: true }), (data, turn) => {
      const variance = circularVariance(data)
      expect(Math.abs(variance - (1 - resultantLength(data)))).toBeLessThan(1e-12)
      for (const other of [data.map((angle) => angle + turn), data.toReversed(), [NaN, ...data]]) {
        expect(Math.abs(circularVariance(other) - variance)).toBeLessThan(1e-12)
        fc.pre(variance < 0.99) // R^2 stands below the line in the dispersion
        expect(Math.abs(circularDispersion(other) - circularDispersion(data))).toBeLessThan(1e-6)
      }
      expect(circularSd(data)).toBeGreaterThanOrEqual(angularDeviation(data) - 1e-9)
    }),
  )
})
