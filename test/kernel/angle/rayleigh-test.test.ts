import fc from 'fast-check'
import { expect, test } from 'vitest'
import { rayleighTest } from '../../../src/kernel/angle/index.ts'
import { REFERENCE_SETS } from './reference-sets.ts'

test.each(REFERENCE_SETS)('$name: z and p of the closed form', ({ angles, rayleighZ, rayleighP }) => {
  const { z, p } = rayleighTest(angles)
  expect(Math.abs(z - rayleighZ)).toBeLessThan(1e-9)
  // The closed form with R's numbers loses about 1e-15 times 1 + 2 n to the difference in its exponent.
  expect(Math.abs(p / rayleighP - 1)).toBeLessThan(1e-10)
})

test('the printed test comes out', () => {
  // Zar (2010), ex. 27.1: z = 5.448, 0.001 < p < 0.002.
  const { z, p } = rayleighTest([45, 55, 81, 96, 110, 117, 132, 154])
  expect(Math.abs(z - 5.448)).toBeLessThan(1e-3)
  expect(Math.abs(p - 0.00185)).toBeLessThan(5e-6)
})

test('p of four angles is near that of the series', () => {
  // Docstring of astropy 5.2.1, `rayleightest` on 130, 90, 0, 145: 0.2563487733797317 by the series in 1 / n.
  expect(Math.abs(rayleighTest([130, 90, 0, 145]).p - 0.2563487733797317)).toBeLessThan(0.005)
})

test('p stays between 0 and 1 where the series falls below 0', () => {
  // Zar (2010), ex. 27.2: astropy 5.2.1 gives -1.01e-5.
  const { p } = rayleighTest([66, 75, 86, 88, 88, 93, 97, 101, 118, 130])
  expect(Math.abs(p - 5.30385876986475e-6)).toBeLessThan(1e-14)
})

test('nothing known gives nothing; angles that cancel give p = 1', () => {
  expect(rayleighTest([])).toEqual({ z: NaN, p: NaN })
  expect(rayleighTest([NaN])).toEqual({ z: NaN, p: NaN })
  expect(rayleighTest([0, 180]).p).toBeCloseTo(1, 12)
})

test('p is a probability for any data', () => {
  const one = fc.oneof(fc.double({ min: -720, max: 720, noNaN: true }), fc.constant(90), fc.constant(NaN))
  fc.assert(
    fc.property(fc.array(one, { minLength: 1, maxLength: 60 }), (data) => {
      fc.pre(data.some((angle) => !Number.isNaN(angle)))
      const { z, p } = rayleighTest(data)
      expect(p >= 0 && p <= 1).toBe(true)
      expect(z >= 0 && z <= data.length).toBe(true)
    }),
  )
  const many = rayleighTest(new Float64Array(1e6).fill(12.3))
  expect(many.p).toBe(0) // exp(-1e6) is below the smallest number
})
