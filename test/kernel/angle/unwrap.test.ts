import fc from 'fast-check'
import { expect, test } from 'vitest'
import { unwrap } from '../../../src/kernel/angle/index.ts'

test('a turn through north runs on instead of jumping', () => {
  expect(Array.from(unwrap([350, 355, 2, 10, 350]))).toEqual([350, 355, 362, 370, 350])
  expect(Array.from(unwrap([5, 350, 340]))).toEqual([5, -10, -20])
  expect(Array.from(unwrap([170, -170, -150, 179]))).toEqual([170, 190, 210, 179])
})

test('gaps stay missing and are bridged from the last known value', () => {
  expect(Array.from(unwrap([NaN, 350, NaN, NaN, 10]))).toEqual([NaN, 350, NaN, NaN, 370])
  expect(Array.from(unwrap([NaN, NaN]))).toEqual([NaN, NaN])
  expect(unwrap([]).length).toBe(0)
})

test('a step of exactly half a turn goes counter-clockwise, from either side', () => {
  expect(Array.from(unwrap([0, 180]))).toEqual([0, -180])
  expect(Array.from(unwrap([180, 0]))).toEqual([180, 0])
  expect(Array.from(unwrap([90, 270]))).toEqual([90, -90])
})

test('the input is not modified', () => {
  const series = Float64Array.of(350, 10)
  unwrap(series)
  expect(Array.from(series)).toEqual([350, 10])
})

test('a path of small steps comes back whole from its wrapped form', () => {
  const steps = fc.array(fc.integer({ min: -179, max: 179 }), { minLength: 1, maxLength: 300 })
  fc.assert(
    fc.property(fc.integer({ min: 0, max: 359 }), steps, (first, moves) => {
      const path = [first]
      for (const move of moves) path.push(path.at(-1)! + move)
      const wrapped = path.map((angle) => ((angle % 360) + 360) % 360)
      expect(Array.from(unwrap(wrapped))).toEqual(path) // whole numbers: exact
    }),
  )
})

test('many turns do not gather rounding', () => {
  const wrapped = new Float64Array(36_000)
  for (let i = 0; i < wrapped.length; i++) wrapped[i] = (i * 100.1) % 360
  const unwrapped = unwrap(wrapped)
  // One rounding of i * 100.1 (up to 3.6e6) and one of the remainder.
  expect(Math.abs(unwrapped.at(-1)! - 35_999 * 100.1)).toBeLessThan(2e-9)
})
