import { expect, test } from 'vitest'
import { farmScenario } from '../../src/simulate/scenario.ts'
import { farmWeather, PAD_MIN } from '../../src/simulate/weather.ts'

const SEEDS = Array.from({ length: 24 }, (_, i) => i + 1)
const months = SEEDS.map((seed) => farmWeather(farmScenario({ seed, days: 30 })))
const mean = (values: readonly number[]) => values.reduce((sum, x) => sum + x, 0) / values.length

test('wind comes from all eight octants within 30 days, for most seeds', () => {
  const complete = months.filter(({ directionDeg }) => {
    const octants = new Set(Array.from(directionDeg, (deg) => Math.floor((((deg % 360) + 360) % 360) / 45)))
    return octants.size === 8
  })
  expect(complete.length).toBeGreaterThan(0.75 * SEEDS.length)
})

test('over many months the wind has the mean that was asked for and the spread of a Weibull distribution', () => {
  const speeds = months.map(({ speedMs }) => mean([...speedMs]))
  // Months differ by about 10 % (15 h time scale in 720 h, sd 0.42): 24 of them have a mean within 3 % or so, fronts add some.
  expect(mean(speeds) / 7.2).toBeGreaterThan(0.92)
  expect(mean(speeds) / 7.2).toBeLessThan(1.12)
  const all = months.flatMap(({ speedMs }) => [...speedMs.filter((_, i) => i % 60 === 0)])
  const centre = mean(all)
  const variation = Math.sqrt(mean(all.map((x) => (x - centre) ** 2))) / centre
  // Coefficient of variation of Weibull distributions of shape 1.8 and 2.6: 0.575 and 0.413.
  expect(variation).toBeGreaterThan(0.413)
  expect(variation).toBeLessThan(0.575)
  expect(Math.min(...all)).toBeGreaterThan(0)
})

test('pressure falls with altitude as the barometric formula says', () => {
  const low = farmWeather(farmScenario({ days: 1, altitudeM: 0, hubHeightM: 100, densityVariation: false }))
  const high = farmWeather(
    farmScenario({ days: 1, altitudeM: 1000, hubHeightM: 100, densityVariation: false }),
  )
  // By hand: exp(-9.80665 * 1000 / (287.05 * 288)) = 0.8881
  expect(high.pressureHpa[PAD_MIN]! / low.pressureHpa[PAD_MIN]!).toBeCloseTo(0.8881, 4)
  expect(new Set(low.temperatureC).size).toBe(1)
})

test('air is more turbulent by day than by night', () => {
  // The scenario starts at midnight UTC, so entry PAD_MIN is 00:00.
  const at = (hour: number) =>
    mean(
      months.flatMap(({ turbulence, speedMs }) =>
        Array.from({ length: 30 }, (_, day) => {
          const i = PAD_MIN + (day * 24 + hour) * 60
          return turbulence[i]! / ((0.75 * speedMs[i]! + 5.6) / Math.max(speedMs[i]!, 3))
        }),
      ),
    )
  expect(at(14) / at(2)).toBeGreaterThan(1.35)
  expect(at(14) / at(2)).toBeLessThan(1.65)
})
