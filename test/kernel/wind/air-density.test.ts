import fc from 'fast-check'
import { expect, test } from 'vitest'
import {
  airDensity,
  normalisedSpeed,
  normalisedStallPower,
  pressureFromAltitude,
  REFERENCE_DENSITY,
} from '../../../src/kernel/wind/index.ts'

test('dry air follows the ideal gas law', () => {
  // B / (R T) with R = 287.05287 J/(kg K) of ISO 2533; the standard's constant is rounded by 1e-5.
  for (const [pressureHpa, temperatureC, expected] of [
    [1013.25, 15, 1.2250122659906943],
    [1000, 20, 1.1883723823090213],
    [950, 5, 1.1898356846312965],
  ] as const) {
    const density = airDensity({ pressureHpa, temperatureC })
    expect(density).toBeCloseTo(expected, 12)
    expect(density / ((pressureHpa * 100) / (287.05287 * (temperatureC + 273.15)))).toBeCloseTo(1, 4)
  }
  expect(airDensity({ pressureHpa: 1013.25, temperatureC: 15 })).toBeCloseTo(REFERENCE_DENSITY, 4)
})

test('humid air is lighter by what a mixture of ideal gases gives', () => {
  // Reference run of the standard's form, and a second way: partial pressures with the saturation pressure of steam
  // tables (1705 Pa at 15 degrees C, 2339 Pa at 20, 4247 Pa at 30), which the standard's form meets within 4 %.
  for (const [pressureHpa, temperatureC, humidityPct, expected, saturationPa] of [
    [1013.25, 15, 50, 1.2212305289608052, 1705],
    [1000, 20, 50, 1.1832741025011082, 2339],
    [900, 30, 100, 1.015706585375122, 4247],
  ] as const) {
    const density = airDensity({ pressureHpa, temperatureC, humidityPct })
    expect(density).toBeCloseTo(expected, 12)
    const vapourPa = (humidityPct / 100) * saturationPa
    const mixture =
      ((pressureHpa * 100 - vapourPa) * 0.0289652 + vapourPa * 0.0180153) /
      (8.314463 * (temperatureC + 273.15))
    expect(Math.abs(density - mixture)).toBeLessThan(0.0005)
  }
})

test('missing humidity counts as dry, missing or impossible pressure and temperature give NaN', () => {
  const dry = airDensity({ pressureHpa: 1000, temperatureC: 20 })
  expect(airDensity({ pressureHpa: 1000, temperatureC: 20, humidityPct: NaN })).toBe(dry)
  expect(airDensity({ pressureHpa: 1000, temperatureC: 20, humidityPct: -9999 })).toBe(dry)
  expect(airDensity({ pressureHpa: NaN, temperatureC: 20 })).toBeNaN()
  expect(airDensity({ pressureHpa: 1000, temperatureC: NaN })).toBeNaN()
  expect(airDensity({ pressureHpa: 0, temperatureC: 20 })).toBeNaN()
  expect(airDensity({ pressureHpa: 1000, temperatureC: -273.15 })).toBeNaN()
})

test('density falls as temperature or humidity rises', () => {
  fc.assert(
    fc.property(
      fc.double({ min: 700, max: 1060, noNaN: true }),
      fc.double({ min: -30, max: 40, noNaN: true }),
      fc.double({ min: 0.01, max: 10, noNaN: true }),
      fc.double({ min: 0, max: 90, noNaN: true }),
      (pressureHpa, temperatureC, warmer, humidityPct) => {
        const here = airDensity({ pressureHpa, temperatureC, humidityPct })
        expect(airDensity({ pressureHpa, temperatureC: temperatureC + warmer, humidityPct })).toBeLessThan(
          here,
        )
        expect(airDensity({ pressureHpa, temperatureC, humidityPct: humidityPct + 10 })).toBeLessThan(here)
      },
    ),
  )
})

test('pressure falls with altitude as in the standard atmosphere', () => {
  // US Standard Atmosphere 1976 and ISO 2533 tables by geometric altitude, two decimals of hPa.
  expect(pressureFromAltitude(0)).toBe(1013.25)
  expect(Math.abs(pressureFromAltitude(1000) - 898.76)).toBeLessThan(0.006)
  expect(Math.abs(pressureFromAltitude(2000) - 795.01)).toBeLessThan(0.006)
})

test('a temperature changes the pressure of a place as a warmer column of air does', () => {
  const standardC = 15 - 0.0065 * 999.843 // geopotential altitude of 1000 m
  expect(pressureFromAltitude(1000, standardC)).toBeCloseTo(pressureFromAltitude(1000), 4)
  // Hydrostatic balance, dp/p = -g dz / (R T), summed in 1 m steps through the same column.
  let pressure = 1013.25
  for (let z = 0.5; z < 1000; z++)
    pressure *= Math.exp(-9.80665 / (287.05287 * (303.15 + 0.0065 * (1000 - z))))
  expect(Math.abs(pressureFromAltitude(1000, 30) - pressure)).toBeLessThan(0.02) // gravity's fall with altitude
  expect(pressureFromAltitude(0, 30)).toBe(1013.25)
  expect(pressureFromAltitude(500, NaN)).toBe(pressureFromAltitude(500))
})

test('an altitude outside the troposphere is refused, a missing one gives NaN', () => {
  for (const altitude of [-1001, 11_001, Infinity]) {
    expect(() => pressureFromAltitude(altitude)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
  }
  expect(pressureFromAltitude(NaN)).toBeNaN()
  expect(pressureFromAltitude(500, -300)).toBeNaN()
})

test('a normalised speed carries the same power at the reference density', () => {
  for (const [speed, density, expected] of [
    [8, 1.1, 7.71807247622151],
    [10, 1.3, 10.20005283131651],
    [10, 1.0, 9.34590374339597],
    [6.5, 1.18, 6.419413179072158],
  ] as const) {
    const normalised = normalisedSpeed(speed, density)
    expect(normalised).toBeCloseTo(expected, 10)
    expect((REFERENCE_DENSITY * normalised ** 3) / (density * speed ** 3)).toBeCloseTo(1, 12)
  }
  expect(normalisedSpeed(8, 1.225)).toBe(8)
  expect(normalisedSpeed(8, NaN)).toBeNaN()
  expect(normalisedSpeed(8, 0)).toBeNaN()
})

test('stall power goes with density', () => {
  expect(normalisedStallPower(1000, 1.1)).toBeCloseTo(1113.6363636363635, 9) // 1000 x 1.225 / 1.1
  expect(normalisedStallPower(1000, 1.225)).toBeCloseTo(1000, 9)
  expect(normalisedStallPower(1000, -1)).toBeNaN()
})
