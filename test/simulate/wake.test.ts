import { expect, test } from 'vitest'
import { thrustAt, wakeDeficit } from '../../src/simulate/wake.ts'

test('on the axis the deficit is the one of a top-hat wake that grows linearly', () => {
  // By hand: CT = 0.75 gives 1 - sqrt(0.25) = 0.5; k x / R = 0.06 * 1000 / 60 = 1, so 0.5 / 4.
  expect(wakeDeficit(1000, 0, 120, 0.75)).toBeCloseTo(0.125, 12)
})

test('across the wake the deficit holds as much as the top hat would', () => {
  // Over the plane: integral of the deficit = top-hat deficit times the area of radius 120 m.
  let sum = 0
  const step = 1
  for (let r = step / 2; r < 1000; r += step) sum += wakeDeficit(1000, r, 120, 0.75) * 2 * Math.PI * r * step
  expect(sum / (0.125 * Math.PI * 120 ** 2)).toBeCloseTo(1, 3)
})

test('a turbine in front or far aside feels nothing, and one that makes no thrust leaves no wake', () => {
  expect(wakeDeficit(-500, 0, 104, 0.8)).toBe(0)
  expect(wakeDeficit(0, 0, 104, 0.8)).toBe(0)
  expect(wakeDeficit(500, 5000, 104, 0.8)).toBe(0)
  expect(thrustAt(2)).toBe(0)
  expect(thrustAt(30)).toBe(0)
  expect(thrustAt(NaN)).toBe(0)
})
