import fc from 'fast-check'
import { expect, test } from 'vitest'
import { signedDifference, wrap180, wrap360 } from '../../../src/kernel/angle/index.ts'

const anyAngle = fc.oneof(
  fc.double({ min: -1e7, max: 1e7, noNaN: true }),
  fc.integer({ min: -2000, max: 2000 }),
  fc.constantFrom(
    -1e-15,
    -5e-324,
    359.99999999999994,
    -359.99999999999994,
    179.99999999999997,
    -180.00000000000003,
  ),
)

test('half a turn wraps to -180, and nothing to 180', () => {
  // By hand; the list of check values for data from turbines.
  const expected = new Map([
    [180, -180],
    [-180, -180],
    [190, -170],
    [540, -180],
    [721, 1],
    [-181, 179],
    [0, 0],
    [179.5, 179.5],
    [-540, -180],
    [-190, 170],
    [360, 0],
  ])
  for (const [angle, wrapped] of expected) expect(wrap180(angle), `wrap180(${angle})`).toBe(wrapped)
})

test('wrapping to a full circle never prints 360', () => {
  expect(wrap360(-1e-15)).toBe(0)
  expect(wrap360(Number('359.99999999999999'))).toBe(0) // the nearest double is 360
  expect(wrap360(359.99999999999994)).toBe(359.99999999999994) // the one before it
  expect(wrap360(360)).toBe(0)
  expect(wrap360(-90)).toBe(270)
  expect(wrap360(725.5)).toBe(5.5)
})

test('zero has no sign after wrapping', () => {
  for (const angle of [-0, 360, -360, -720]) {
    expect(wrap180(angle), `wrap180(${angle})`).toBe(0)
    expect(wrap360(angle), `wrap360(${angle})`).toBe(0)
  }
})

test('what is missing stays missing', () => {
  for (const angle of [NaN, Infinity, -Infinity]) {
    expect(wrap180(angle)).toBeNaN()
    expect(wrap360(angle)).toBeNaN()
    expect(signedDifference(angle, 10)).toBeNaN()
    expect(signedDifference(10, angle)).toBeNaN()
  }
})

test('small angles keep every digit', () => {
  expect(wrap180(1e-20)).toBe(1e-20)
  expect(wrap180(-1e-20)).toBe(-1e-20)
})

test('every angle lands in its half-open interval and moves by whole turns only', () => {
  fc.assert(
    fc.property(anyAngle, (angle) => {
      const signed = wrap180(angle)
      const full = wrap360(angle)
      expect(signed >= -180 && signed < 180).toBe(true)
      expect(full >= 0 && full < 360).toBe(true)
      // The angle and its wrapped form differ by turns; the difference itself is rounded at the size of the angle.
      const slack = Math.abs(angle) * Number.EPSILON + 1e-13
      for (const wrapped of [signed, full]) {
        const turns = (angle - wrapped) / 360
        expect(Math.abs(turns - Math.round(turns)) * 360).toBeLessThanOrEqual(slack)
      }
      expect(wrap180(signed)).toBe(signed)
      expect(wrap360(full)).toBe(full)
    }),
  )
})

test('a difference is positive when the first stands clockwise of the second', () => {
  expect(signedDifference(5, 355)).toBe(10)
  expect(signedDifference(355, 5)).toBe(-10)
  expect(signedDifference(270, 90)).toBe(-180)
  expect(signedDifference(90, 270)).toBe(-180)
})
