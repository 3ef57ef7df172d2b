import fc from 'fast-check'
import { expect, test } from 'vitest'
import { besselRatio, vonMisesKappa, vonMisesKappaCorrected } from '../../../src/kernel/angle/index.ts'
import { REFERENCE_SETS } from './reference-sets.ts'

const relative = (got: number, expected: number): number => Math.abs(got / expected - 1)

test('the Bessel ratio agrees with other arithmetic from tiny to huge concentrations', () => {
  // mpmath 1.3.0 with 40 digits, rounded to doubles: I_p(kappa) / I_0(kappa) for p = 1, 2, 3. A_1 up to 500 also in R 4.2.2.
  const table: [number, number, number, number][] = [
    [0.001, 0.0004999999375000105, 1.2499997916667025e-7, 2.083332942708402e-11],
    [0.1, 0.04993760398793892, 0.0012479202412216117, 2.0794339074459473e-5],
    [1, 0.4463899658965345, 0.10722006820693099, 0.017509693068810565],
    [2, 0.697774657964008, 0.302225342035992, 0.09332397389202395],
    [5, 0.8933831370440852, 0.6426467451823659, 0.3792657408981925],
    [10, 0.9485998259548459, 0.8102800348090308, 0.6244878120312336],
    [49.9, 0.9899287204074461, 0.9603234981800622, 0.9129488808739741],
    [50, 0.9899489673784978, 0.9604020413048601, 0.9131168040741089],
    [50.1, 0.9899691330985527, 0.9604802741278022, 0.9132840812719817],
    [100, 0.9949873730051688, 0.9801002525398966, 0.9557833629035729],
    [1e4, 0.999949998749875, 0.99980001000025, 0.9995500787458749],
    [1e6, 0.999999499999875, 0.999998000001, 0.999995500007875],
  ]
  for (const [kappa, ...ratios] of table) {
    for (const order of [1, 2, 3] as const) {
      const got = besselRatio(kappa, order)
      expect(relative(got, ratios[order - 1]!), `A_${order}(${kappa})`).toBeLessThan(5e-15)
    }
    expect(besselRatio(kappa)).toBe(besselRatio(kappa, 1))
  }
  expect(relative(besselRatio(500), 0.998999498996862)).toBeLessThan(1e-14) // R 4.2.2
})

test('the ends of the range of the concentration', () => {
  expect(besselRatio(0)).toBe(0)
  expect(besselRatio(1e-300)).toBe(5e-301)
  expect(besselRatio(1e300)).toBe(1)
  expect(besselRatio(Infinity, 3)).toBe(1)
  expect(besselRatio(NaN)).toBeNaN()
})

test('a negative concentration and an order that is not kept are refused', () => {
  expect(() => besselRatio(-1)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
  expect(() => besselRatio(1, 4 as 3)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
})

test('the ratios obey the recurrence of Bessel functions', () => {
  // I_(v-1) - I_(v+1) = (2 v / kappa) I_v (Abramowitz & Stegun 1964, eq. 9.6.26), divided by I_0.
  fc.assert(
    fc.property(fc.double({ min: 0.01, max: 1000, noNaN: true }), (kappa) => {
      const [one, two, three] = [besselRatio(kappa), besselRatio(kappa, 2), besselRatio(kappa, 3)]
      expect(Math.abs(1 - two - (2 / kappa) * one)).toBeLessThan(1e-14)
      expect(Math.abs(one - three - (4 / kappa) * two)).toBeLessThan(1e-14)
    }),
  )
})

test('kappa is the root of the likelihood equation', () => {
  // mpmath 1.3.0 with 40 digits, rounded to doubles; all but 0.001, 0.98994, 0.98995 and 0.999999 also in R 4.2.2 by uniroot.
  const table: [number, number][] = [
    [0.001, 0.0020000010000008335],
    [0.3, 0.6292153761056903],
    [0.5, 1.1593199207501383],
    [0.53, 1.2567234728798315],
    [0.8, 2.8712867071866017],
    [0.85, 3.680407818891119],
    [0.9, 5.304689062957719],
    [0.95, 10.271688802208379],
    [0.98994, 49.955660361191974],
    [0.98995, 50.00511092806627],
    [0.99, 50.253847401099684],
    [0.999, 500.2503759409855],
    [0.999999, 500000.24998599716],
  ]
  for (const [resultant, kappa] of table) {
    // A rounding of R moves kappa by A_1' = 1 / (2 kappa^2) of it: 2 kappa in relative terms.
    const tolerance = 4e-15 * (1 + kappa)
    expect(relative(vonMisesKappa(resultant), kappa), `resultant ${resultant}`).toBeLessThan(tolerance)
  }
})

test.each(REFERENCE_SETS)('$name: kappa is exact, and R differs by its approximation alone', (set) => {
  expect(relative(vonMisesKappa(set.resultant), set.kappa)).toBeLessThan(1e-6)
  expect(relative(vonMisesKappa(set.resultant), set.kappaR)).toBeLessThan(0.01)
  const corrected = vonMisesKappaCorrected(set.resultant, set.angles.length)
  expect(relative(corrected, set.kappaCorrectedR)).toBeLessThan(0.01)
})

test('another library has the same kappa for four angles', () => {
  // astropy 5.2.1, `vonmisesmle` on 130, 90, 0, 145 degrees: 1.49358958737054 by the piecewise fit.
  const resultant = Math.hypot(
    [130, 90, 0, 145].reduce((sum, a) => sum + Math.sin((a * Math.PI) / 180), 0) / 4,
    [130, 90, 0, 145].reduce((sum, a) => sum + Math.cos((a * Math.PI) / 180), 0) / 4,
  )
  expect(relative(vonMisesKappa(resultant), 1.49358958737054)).toBeLessThan(0.01)
})

test('no preference gives 0, no spread Infinity, and a missing resultant nothing', () => {
  expect(vonMisesKappa(0)).toBe(0)
  expect(vonMisesKappa(1e-300)).toBe(2e-300)
  expect(vonMisesKappa(1)).toBe(Infinity)
  expect(vonMisesKappa(1 + 1e-15)).toBe(Infinity)
  expect(vonMisesKappa(NaN)).toBeNaN()
  expect(() => vonMisesKappa(-1e-9)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
})

test('the ratio at kappa gives the resultant back', () => {
  const resultants = fc.oneof(
    fc.double({ min: 0, max: 1, noNaN: true, maxExcluded: true }),
    fc.double({ min: -15, max: 0, noNaN: true }).map((exponent) => 1 - 10 ** exponent),
    fc.double({ min: -300, max: -1, noNaN: true }).map((exponent) => 10 ** exponent),
  )
  fc.assert(
    fc.property(resultants, (resultant) => {
      const back = besselRatio(vonMisesKappa(resultant))
      expect(Math.abs(back - resultant)).toBeLessThanOrEqual(4e-15 * resultant)
    }),
    { numRuns: 1000 },
  )
})

test('a longer resultant never gives a smaller kappa', () => {
  const unit = fc.double({ min: 0, max: 1, noNaN: true })
  fc.assert(
    fc.property(unit, unit, (a, b) => {
      const [low, high] = [vonMisesKappa(Math.min(a, b)), vonMisesKappa(Math.max(a, b))]
      expect(high).toBeGreaterThanOrEqual(low * (1 - 1e-12))
    }),
  )
  // Across the two forms of the Bessel ratio, which change over at kappa = 50.
  let previous = 0
  for (let i = 0; i <= 2000; i++) {
    const kappa = vonMisesKappa(0.9899 + i * 5e-8)
    expect(kappa).toBeGreaterThan(previous)
    previous = kappa
  }
})

test('the correction for small samples follows its two branches', () => {
  // By hand on the root: R = 0.5, n = 10: 1.159319920750138 - 2 / 11.59319920750138 = 0.986804...
  expect(vonMisesKappaCorrected(0.5, 10)).toBeCloseTo(1.159319920750138 - 2 / 11.59319920750138, 12)
  // R = 0.9, n = 10: 729 / 1010 times the root.
  expect(vonMisesKappaCorrected(0.9, 10)).toBeCloseTo((729 / 1010) * 5.304689062957719, 12)
  expect(vonMisesKappaCorrected(0.1, 5)).toBe(0) // would be below 0
  expect(vonMisesKappaCorrected(0, 5)).toBe(0)
  expect(vonMisesKappaCorrected(1, 5)).toBe(Infinity)
  expect(vonMisesKappaCorrected(1, 1)).toBe(0)
  expect(vonMisesKappaCorrected(NaN, 5)).toBeNaN()
  for (const count of [0, NaN, -3]) {
    expect(() => vonMisesKappaCorrected(0.5, count)).toThrow(
      expect.objectContaining({ code: 'OUT_OF_RANGE' }),
    )
  }
})
