import { expect, test } from 'vitest'
import { gapDeg } from '../angle/gap-deg.ts'
import {
  pathSoundMs,
  pathSpeedMs,
  sonicTemperatureC,
  ultrasonicWind,
} from '../../../src/kernel/decode/index.ts'

const RAD = Math.PI / 180

/** Times of flight along a bearing in wind from a direction: the pulse points against what blows across, so that c shrinks. */
function transitsOf(
  { fromDeg, speedMs, soundMs }: { fromDeg: number; speedMs: number; soundMs: number },
  lengthM: number,
  bearingDeg: number,
): [number, number] {
  const along = -speedMs * Math.cos((bearingDeg - fromDeg) * RAD)
  const across = speedMs * Math.sin((bearingDeg - fromDeg) * RAD)
  const sound = Math.sqrt(soundMs ** 2 - across ** 2)
  return [lengthM / (sound + along), lengthM / (sound - along)]
}

test('times of flight give the speed of the air and of sound', () => {
  // Worked out from the formula of an instrument manual: L, c, V, forward and backward time in microseconds.
  for (const [length, sound, speed, forward, backward] of [
    [0.2, 340, 10, 571.4285714, 606.0606061],
    [0.15, 343.2, -7.5, 446.8275246, 427.7159966],
  ] as const) {
    // A time rounded to 1e-7 us moves the result by 3e-8.
    expect(Math.abs(pathSpeedMs(length, forward * 1e-6, backward * 1e-6) - speed)).toBeLessThan(1e-6)
    expect(Math.abs(pathSoundMs(length, forward * 1e-6, backward * 1e-6) - sound)).toBeLessThan(1e-6)
  }
})

test('times rounded to a tenth of a microsecond are off by 0.02 m/s', () => {
  expect(pathSpeedMs(0.2, 571.4e-6, 606.1e-6)).toBeCloseTo(10.0195, 4)
  expect(pathSoundMs(0.2, 571.4e-6, 606.1e-6)).toBeCloseTo(339.998, 3)
})

test('the sonic temperature lies within 0.3 % of what an ideal gas of dry air has', () => {
  // c^2 = 1.4 x 287.05 J/kg/K x T; the constant in use is 403 (Kaimal & Gaynor 1991), 0.28 % more.
  const idealK = 340 ** 2 / (1.4 * 287.05)
  expect(Math.abs((sonicTemperatureC(340) + 273.15) / idealK - 1)).toBeLessThan(0.003)
})

test('two and three paths give speed, direction and temperature of any wind', () => {
  const soundMs = 340
  for (const directionsDeg of [
    [0, 90],
    [45, 135],
    [0, 120, 240],
    [10, 70, 130],
  ]) {
    for (const fromDeg of [0, 37, 90, 181, 359]) {
      const transitS = directionsDeg.flatMap((bearing) =>
        transitsOf({ fromDeg, speedMs: 12, soundMs }, 0.2, bearing).map((time) => Float64Array.of(time)),
      )
      const wind = ultrasonicWind(transitS, { pathLengthM: 0.2, directionsDeg })
      const name = `${directionsDeg.join('/')} from ${fromDeg}`
      expect(wind.speedMs[0], name).toBeCloseTo(12, 9)
      expect(gapDeg(wind.directionDeg[0]!, fromDeg), name).toBeLessThan(1e-8)
      expect(wind.temperatureC[0], name).toBeCloseTo(sonicTemperatureC(soundMs), 8)
      if (directionsDeg.length === 3) expect(wind.closureMs[0], name).toBeLessThan(1e-9)
      else expect(wind.closureMs[0], name).toBeNaN()
    }
  }
})

test('a path that fails leaves two, a path that lies shows in the closure', () => {
  const directionsDeg = [0, 120, 240]
  const air = { fromDeg: 20, speedMs: 9, soundMs: 335 }
  const transitS = directionsDeg.flatMap((bearing) =>
    transitsOf(air, 0.2, bearing).map((time) => Float64Array.of(time, time)),
  )
  transitS[2]![0] = NaN
  transitS[4]![1]! *= 1.01
  const wind = ultrasonicWind(transitS, { pathLengthM: 0.2, directionsDeg })
  expect(wind.speedMs[0]).toBeCloseTo(9, 9)
  expect(wind.closureMs[0]).toBeNaN()
  // 1 % of c, halved, spread over three paths.
  expect(wind.closureMs[1]).toBeGreaterThan(0.4)
})

test('times that are none, and calm, have no direction', () => {
  const still = 0.2 / 340
  const wind = ultrasonicWind(
    [
      Float64Array.of(0, still),
      Float64Array.of(still, still),
      Float64Array.of(still, still),
      Float64Array.of(still, still),
    ],
    { pathLengthM: 0.2, directionsDeg: [0, 90] },
  )
  expect([...wind.directionDeg]).toEqual([NaN, NaN])
  expect([...wind.speedMs]).toEqual([NaN, 0])
})

test('sensors that cannot be are refused', () => {
  const times = [1, 2, 3, 4].map(() => Float64Array.of(6e-4))
  const refused = (code: string): unknown => expect.objectContaining({ code })
  expect(() => ultrasonicWind(times, { pathLengthM: 0.2, directionsDeg: [0, 180] })).toThrow(
    refused('OUT_OF_RANGE'),
  )
  expect(() => ultrasonicWind(times, { pathLengthM: NaN, directionsDeg: [0, 90] })).toThrow(
    refused('OUT_OF_RANGE'),
  )
  expect(() => ultrasonicWind(times, { pathLengthM: 0.2, directionsDeg: [0] })).toThrow(
    refused('OUT_OF_RANGE'),
  )
  expect(() => ultrasonicWind(times.slice(1), { pathLengthM: 0.2, directionsDeg: [0, 90] })).toThrow(
    refused('LENGTH_MISMATCH'),
  )
})
