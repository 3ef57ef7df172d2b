import fc from 'fast-check'
import { expect, test } from 'vitest'
import { circularMean, resultantLength, unitVectorMean } from '../../../src/kernel/angle/index.ts'
import { gapDeg } from './gap-deg.ts'
import { REFERENCE_SETS } from './reference-sets.ts'

const RAD = Math.PI / 180
const angles = fc.array(fc.double({ min: -720, max: 720, noNaN: true }), { minLength: 1, maxLength: 40 })

test('north is crossed: 359 and 1 average to 0, not 180', () => {
  // By hand; 6.77728 from the closed form, computed with numpy 1.24.2.
  const expected: [number[], number][] = [
    [[359, 1], 0],
    [[350, 10], 0],
    [[355, 5, 0], 0],
    [[340, 30, 10], 6.77728],
    [[358, 359, 0, 1, 2, 3], 0.5],
    [[1, 0, 359], 0],
    [[315, 45], 0],
  ]
  for (const [data, mean] of expected) {
    const { direction } = circularMean(data)
    expect(gapDeg(direction, mean), String(data)).toBeLessThan(mean === 6.77728 ? 5e-6 : 1e-12)
    expect(direction >= 0 && direction < 360).toBe(true)
  }
})

test('books and other programs have the same mean and resultant', () => {
  // Zar (2010), ex. 26.1: 06:15 of 24 hours, and day 45 of 365.
  expect(circularMean([(6.25 / 24) * 360]).direction).toBeCloseTo(93.75, 9)
  expect(circularMean([(45 / 365) * 360]).direction).toBeCloseTo(44.384, 3)
  // Zar (2010), ex. 26.4.
  const trees = circularMean([45, 55, 81, 96, 110, 117, 132, 154])
  expect(Math.abs(trees.resultant - 0.82522)).toBeLessThan(5e-6)
  expect(Math.abs(trees.direction - 98.98775)).toBeLessThan(5e-6)
  expect(Math.abs(trees.resultant * Math.sin(trees.direction * RAD) - 0.81509)).toBeLessThan(5e-6)
  expect(Math.abs(trees.resultant * Math.cos(trees.direction * RAD) + 0.12892)).toBeLessThan(5e-6)
  // Docstring of scipy 1.10.1 `circmean`.
  expect(Math.abs(circularMean([20, 30, 330]).direction - 7.294976657784009)).toBeLessThan(1e-12)
  // Docstring of astropy 5.2.1 `circmean`; `vonmisesmle` for the second.
  expect(Math.abs(circularMean([51, 67, 40, 109, 31, 358]).direction - 48.62718088722989)).toBeLessThan(1e-12)
  expect(Math.abs(circularMean([130, 90, 0, 145]).direction - 101.16894320013179)).toBeLessThan(1e-12)
  // Fisher (1993), p. 78: 247.6 for app. B.6 set 2; Pewsey et al. (2013), ch. 3: 3.10 and 0.83 for app. B.11.
  const crossBeds = REFERENCE_SETS.find(({ name }) => name === 'fisherB6_2')!
  expect(Math.abs(circularMean(crossBeds.angles).direction - 247.6)).toBeLessThan(0.05)
  const seaStars = circularMean(REFERENCE_SETS.find(({ name }) => name === 'fisherB11')!.angles)
  expect(Math.abs(seaStars.direction - 3.1)).toBeLessThan(0.005)
  expect(Math.abs(seaStars.resultant - 0.83)).toBeLessThan(0.005)
})

test.each(REFERENCE_SETS)('$name: mean and resultant as in R', ({ angles: data, meanDeg, resultant }) => {
  const mean = circularMean(data)
  expect(gapDeg(mean.direction, meanDeg)).toBeLessThan(1e-6)
  expect(Math.abs(mean.resultant - resultant)).toBeLessThan(1e-9)
  expect(mean.count).toBe(data.length)
})

test('counts are weights', () => {
  // Zar (2010), ex. 26.5: 105 directions in classes of 30 degrees.
  const centres = [15, 45, 75, 105, 135, 165, 195, 225, 255, 285, 315, 345]
  const mean = circularMean(centres, [0, 6, 9, 13, 15, 22, 17, 12, 8, 3, 0, 0])
  expect(Math.abs(mean.direction - 161.565)).toBeLessThan(5e-4)
  expect(Math.abs(mean.resultant - 0.55064)).toBeLessThan(5e-6)
  // Zar (2010), ex. 26.8: mean of means, each with the resultant of its sample.
  const lengths = [0.8954, 0.7747, 0.4696, 0.8794, 0.3922, 0.6952, 0.3338]
  const ofMeans = circularMean([160, 169, 117, 140, 186, 134, 171], lengths)
  const total = lengths.reduce((sum, length) => sum + length, 0)
  expect(Math.abs(ofMeans.direction - 152)).toBeLessThan(0.5)
  expect(Math.abs((ofMeans.resultant * total) / lengths.length - 0.59634)).toBeLessThan(1e-5)
})

test('zero total weight and no data have no mean', () => {
  expect(circularMean([])).toEqual({ direction: NaN, resultant: NaN, count: 0 })
  expect(circularMean([NaN, NaN])).toEqual({ direction: NaN, resultant: NaN, count: 0 })
  expect(circularMean([10, 20], [0, 0])).toEqual({ direction: NaN, resultant: NaN, count: 2 })
})

test('angles that cancel have a resultant near zero and no direction', () => {
  const uniform = Array.from({ length: 36 }, (_, i) => i * 10)
  for (const data of [[90, 270], [0, 120, 240], uniform]) {
    const { direction, resultant } = circularMean(data)
    expect(direction).toBeNaN()
    expect(resultant).toBeLessThan(1e-15)
  }
})

test('a missing angle or weight drops the pair', () => {
  const whole = circularMean([10, 80], [1, 3])
  expect(circularMean([10, NaN, 80, 200, Infinity], [1, 5, 3, NaN, 1])).toEqual(whole)
})

test('wrong weights are refused by code', () => {
  expect(() => circularMean([1, 2], [1])).toThrow(expect.objectContaining({ code: 'LENGTH_MISMATCH' }))
  expect(() => circularMean([1, 2], [1, -0.5])).toThrow(expect.objectContaining({ code: 'NEGATIVE_WEIGHT' }))
  expect(() => circularMean([1], [Infinity])).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
})

test('turning every angle turns the mean by as much', () => {
  fc.assert(
    fc.property(angles, fc.double({ min: -720, max: 720, noNaN: true }), (data, turn) => {
      const mean = circularMean(data)
      const turned = circularMean(data.map((angle) => angle + turn))
      expect(Math.abs(turned.resultant - mean.resultant)).toBeLessThan(1e-12)
      fc.pre(mean.resultant > 1e-6) // sums carry 1e-14, the direction 1e-14 / resultant radians
      expect(gapDeg(turned.direction, mean.direction + turn)).toBeLessThan(1e-6)
      expect(turned.direction >= 0 && turned.direction < 360).toBe(true)
    }),
  )
})

test('order, missing values, whole turns and weights of 1 do not matter', () => {
  fc.assert(
    fc.property(angles, fc.integer({ min: -3, max: 3 }), (data, turns) => {
      const mean = circularMean(data)
      fc.pre(mean.resultant > 1e-6)
      const variants = {
        reversed: circularMean(data.toReversed()),
        withGaps: circularMean(data.flatMap((angle) => [NaN, angle])),
        turned: circularMean(data.map((angle) => angle + 360 * turns)),
        weighted: circularMean(
          data,
          data.map(() => 1),
        ),
      }
      for (const [name, variant] of Object.entries(variants)) {
        expect(gapDeg(variant.direction, mean.direction), name).toBeLessThan(1e-6)
        expect(Math.abs(variant.resultant - mean.resultant), name).toBeLessThan(1e-12)
        expect(variant.count, name).toBe(mean.count)
      }
    }),
  )
})

test('the resultant never passes 1', () => {
  fc.assert(
    fc.property(
      fc.double({ min: -720, max: 720, noNaN: true }),
      fc.integer({ min: 1, max: 200 }),
      (angle, n) => {
        const resultant = resultantLength(new Float64Array(n).fill(angle))
        expect(resultant).toBeLessThanOrEqual(1)
        expect(resultant).toBeGreaterThan(1 - 1e-13)
      },
    ),
  )
})

test('sums made elsewhere give the same mean as the samples', () => {
  const data = [350, 355, 5, 10, 20]
  const sumSin = data.reduce((sum, angle) => sum + Math.sin(angle * RAD), 0)
  const sumCos = data.reduce((sum, angle) => sum + Math.cos(angle * RAD), 0)
  const mean = unitVectorMean(sumSin, sumCos, 5)
  // Closed form, computed with numpy 1.24.2.
  expect(Math.abs(mean.direction - 3.9913928902426568)).toBeLessThan(1e-12)
  expect(mean).toEqual(circularMean(data))
  expect(unitVectorMean(0, 0, 0)).toEqual({ direction: NaN, resultant: NaN, count: 0 })
  expect(unitVectorMean(NaN, 1, 2).direction).toBeNaN()
})

test('sums that so many angles cannot have are refused', () => {
  for (const [sumSin, sumCos, count] of [
    [3, 4, 4],
    [1, 0, 0],
    [0, 1, 1.5],
    [0, 1, -1],
    [0, 1, NaN],
  ] as const) {
    expect(() => unitVectorMean(sumSin, sumCos, count)).toThrow(
      expect.objectContaining({ code: 'OUT_OF_RANGE' }),
    )
  }
  expect(unitVectorMean(0, 1 + 1e-12, 1).resultant).toBe(1) // rounding of stored sums
})

test('speeds as weights give the resultant wind', () => {
  // Worked example with the numbers of US EPA (2000), EPA-454/R-99-005, sec. 6.2: 5 m/s from 350 and 10 m/s from 20.
  const wind = circularMean([350, 20], [5, 10])
  expect(Math.abs(wind.direction - 10.1039094)).toBeLessThan(5e-8)
  expect(Math.abs(wind.resultant * 7.5 - 7.2732823)).toBeLessThan(5e-8)
  expect(Math.abs(circularMean([350, 20]).direction - 5)).toBeLessThan(1e-12)
})
