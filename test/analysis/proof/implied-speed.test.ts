import { expect, test } from 'vitest'
import { curveBothWays } from '../../../src/analysis/proof/implied-speed.ts'
import { measuredPowerCurve } from '../../../src/kernel/wind/index.ts'

const speeds = Float64Array.from({ length: 4000 }, (_, i) => 3 + (12 * i) / 4000)
const cubic = measuredPowerCurve(
  speeds,
  speeds.map((u) => Math.min(2000, 1.5 * u ** 3)),
)

test('below rated, the wind speed of a power is that of the power of a wind speed', () => {
  const both = curveBothWays(cubic)!
  for (const speed of [4, 5.3, 7.77, 9.9]) expect(both.speed(both.power(speed))).toBeCloseTo(speed, 6)
  // Power of the measured curve at 8 m/s by the rule it was made with: 1.5 x 512 kW; bins are 0.5 m/s wide.
  expect(both.power(8)).toBeCloseTo(768, -1)
})

test('beyond the ends the ends hold: no power gives a wind speed that the curve does not have', () => {
  const both = curveBothWays(cubic)!
  expect(both.speed(-50)).toBeCloseTo(cubic.speedsMs[0]!, 12)
  expect(both.speed(1e6)).toBeLessThanOrEqual(cubic.speedsMs.at(-1)!)
  expect(both.power(1000)).toBe(both.power(cubic.speedsMs.at(-1)!))
  expect(both.speed(NaN)).toBeNaN()
})

test('a curve without points has no way back', () => {
  expect(curveBothWays(measuredPowerCurve([], []))).toBeNull()
})
