import fc from 'fast-check'
import { expect, test } from 'vitest'
import {
  circularSdFromResultant,
  intervalStatistics,
  mitsutaStatistics,
  yamartinoSigma,
} from '../../../src/kernel/angle/index.ts'
import { gapDeg } from './gap-deg.ts'

/** Closed forms, computed with numpy 1.24.2; the first is the textbook's counter-example to the arithmetic mean, 120. */
const WORKED = [
  { data: [1, 0, 359], mean: 0, yamartino: 0.8164934919315043, mitsuta: 0, sd: 0.816496580927726 },
  { data: [350, 10], mean: 0, yamartino: 10.008100326328327, mitsuta: 0, sd: 10 },
  {
    data: [350, 355, 5, 10, 20],
    mean: 3.9913928902426568,
    yamartino: 10.676374096404267,
    mitsuta: 4,
    sd: 10.677078252031311,
  },
  { data: [315, 45], mean: 0, yamartino: 47.46127049417653, mitsuta: 0, sd: 45 },
  {
    data: [45, 55, 81, 96, 110, 117, 132, 154],
    mean: 98.98775195039644,
    yamartino: 35.348020660286764,
    mitsuta: 98.75,
    sd: 34.898961302594664,
  },
  {
    data: [355, 358, 2, 6, 3, 359, 356, 0, 4, 10],
    mean: 1.2982816267390453,
    yamartino: 4.40453838740793,
    mitsuta: 1.3,
    sd: 4.405678154382137,
  },
]

test.each(WORKED)('worked example $data', ({ data, mean, yamartino, mitsuta, sd }) => {
  const unit = intervalStatistics(data)
  expect(gapDeg(unit.direction, mean)).toBeLessThan(1e-6)
  expect(Math.abs(unit.sigma - yamartino)).toBeLessThan(1e-6)
  expect(unit.count).toBe(data.length)
  const scalar = mitsutaStatistics(data)
  expect(gapDeg(scalar.direction, mitsuta)).toBeLessThan(1e-9)
  expect(Math.abs(scalar.sd - sd)).toBeLessThan(1e-9)
  expect(scalar.direction >= 0 && scalar.direction < 360).toBe(true)
})

test('opposite directions have no mean but the known worst case of sigma', () => {
  // Yamartino (1984): 103.92 where the true value is 90; 180 / sqrt(3).
  const unit = intervalStatistics([270, 90])
  expect(unit.direction).toBeNaN()
  expect(Math.abs(unit.sigma - 180 / Math.sqrt(3))).toBeLessThan(1e-6)
  const scalar = mitsutaStatistics([270, 90])
  expect(scalar).toEqual({ direction: NaN, sd: 90, count: 2, largestStep: 180 })
})

test('directions without preference: sigma of the uniform, and a scalar mean of the path', () => {
  const uniform = Array.from({ length: 36 }, (_, i) => i * 10)
  expect(Math.abs(intervalStatistics(uniform).sigma - 103.92304845413265)).toBeLessThan(1e-6)
  const scalar = mitsutaStatistics(uniform)
  expect(Math.abs(scalar.direction - 175)).toBeLessThan(1e-9)
  expect(Math.abs(scalar.sd - 103.88294694831615)).toBeLessThan(1e-9)
})

test('sigma of a wrapped normal population is close to its standard deviation', () => {
  // Closed forms, R = exp(-s^2 / 2), computed with numpy 1.24.2; tolerance 1e-6 degrees.
  for (const [spread, sigma] of [
    [5, 4.997338305021417],
    [10, 9.982653723223523],
    [20, 19.91655191245331],
    [40, 39.82011647523243],
    [60, 59.29419599171939],
  ] as const) {
    const resultant = Math.exp(-(((spread * Math.PI) / 180) ** 2) / 2)
    expect(Math.abs(yamartinoSigma(0, resultant) - sigma), `spread ${spread}`).toBeLessThan(1e-6)
    expect(Math.abs(circularSdFromResultant(resultant) - spread), `spread ${spread}`).toBeLessThan(1e-9)
  }
})

test('sigma needs the length of the mean vector only, and bears its rounding', () => {
  expect(yamartinoSigma(0.6, 0.3)).toBeCloseTo(yamartinoSigma(-0.3, 0.6), 12)
  expect(yamartinoSigma(0, 1 + 1e-9)).toBe(0)
  expect(yamartinoSigma(NaN, 0.5)).toBeNaN()
  expect(yamartinoSigma(0.5, NaN)).toBeNaN()
  expect(() => yamartinoSigma(0.9, 0.9)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
})

test('nothing known gives nothing, one sample no spread', () => {
  expect(intervalStatistics([NaN])).toEqual({ direction: NaN, sigma: NaN, resultant: NaN, count: 0 })
  expect(mitsutaStatistics([])).toEqual({ direction: NaN, sd: NaN, count: 0, largestStep: NaN })
  expect(mitsutaStatistics([NaN, -10])).toEqual({ direction: 350, sd: 0, count: 1, largestStep: 0 })
})

test('the path is followed over gaps and through several turns', () => {
  expect(mitsutaStatistics([350, NaN, 10])).toEqual(mitsutaStatistics([350, 10]))
  // By hand: 0, 100, ... 700 on the line: mean 350, population variance 100^2 (8^2 - 1) / 12.
  const turning = Array.from({ length: 8 }, (_, i) => (i * 100) % 360)
  const { direction, sd, largestStep } = mitsutaStatistics(turning)
  expect(Math.abs(direction - 350)).toBeLessThan(1e-9)
  expect(Math.abs(sd - 100 * Math.sqrt(63 / 12))).toBeLessThan(1e-9)
  expect(largestStep).toBe(100)
})

test('turning all samples turns both means and keeps both spreads', () => {
  const walk = fc.array(fc.double({ min: -8, max: 8, noNaN: true }), { minLength: 1, maxLength: 60 })
  fc.assert(
    fc.property(walk, fc.double({ min: -720, max: 720, noNaN: true }), (steps, turn) => {
      const data = [0]
      for (const step of steps) data.push(Math.max(-80, Math.min(80, data.at(-1)! + step)))
      const turned = data.map((angle) => angle + turn)
      const [unit, unitTurned] = [intervalStatistics(data), intervalStatistics(turned)]
      expect(gapDeg(unitTurned.direction, unit.direction + turn)).toBeLessThan(1e-9)
      // Sigma takes the root of the rounding of 1 - R^2: up to 1e-6 degrees where there is hardly any spread.
      expect(Math.abs(unitTurned.sigma - unit.sigma)).toBeLessThan(3e-6)
      const [scalar, scalarTurned] = [mitsutaStatistics(data), mitsutaStatistics(turned)]
      expect(gapDeg(scalarTurned.direction, scalar.direction + turn)).toBeLessThan(1e-9)
      expect(Math.abs(scalarTurned.sd - scalar.sd)).toBeLessThan(1e-9)
    }),
  )
})

test('an even vane of coarse steps does not shift the mean by more than its rounding', () => {
  // Steps of 360 / 256; rounding errors are within half a step and average out along a slow, wide path.
  const step = 360 / 256
  const path = Array.from({ length: 5000 }, (_, i) => 355 + 25 * Math.sin(i / 97))
  const stepped = path.map((angle) => Math.round(angle / step) * step)
  const shift = gapDeg(intervalStatistics(stepped).direction, intervalStatistics(path).direction)
  expect(shift).toBeLessThan(0.05)
})
